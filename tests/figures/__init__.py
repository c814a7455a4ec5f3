"""Tests of planner.figures."""
