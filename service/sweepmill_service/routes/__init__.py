"""The calls of the HTTP interface, one module for each noun."""
