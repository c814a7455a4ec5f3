"""Transfers against brute recomputation and closed forms."""
