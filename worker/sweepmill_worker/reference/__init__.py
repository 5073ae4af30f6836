"""The signed simulation: circuits on stim's tableau simulator, with our own words for the outcomes."""
