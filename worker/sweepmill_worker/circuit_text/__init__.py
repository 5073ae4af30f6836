"""The circuit of one trajectory as text that other programs read."""
