"""Colours, fonts and spacing."""
