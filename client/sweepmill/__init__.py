"""Sweepmill."""
