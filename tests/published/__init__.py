"""Checks against sources outside the project, through planner's public functions."""
