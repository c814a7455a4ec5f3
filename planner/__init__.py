"""Rangewright: which items stay, go and come in a category, and what happens to their sales."""

__version__ = "0.1.0"
