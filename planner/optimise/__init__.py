"""Limits, best assortment, proven bound, ladder of changes; and a verifier."""
