"""Circuits written as data: compiled once to tables, then drawn and executed trajectory by trajectory."""
