"""Frozen records of what the user decided."""
