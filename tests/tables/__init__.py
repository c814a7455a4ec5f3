"""Tests of planner.tables."""
