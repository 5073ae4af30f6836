"""The engine of measurement-only ZZ / X chains, whose states are GHZ clusters; its public face is `engine`."""
