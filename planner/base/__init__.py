"""Errors, progress, text marker, child-process runner: what every layer may use."""
