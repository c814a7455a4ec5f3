"""Painted and composed widgets."""
