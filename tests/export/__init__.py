"""Tests of planner.export."""
