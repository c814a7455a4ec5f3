"""Tests of planner.planfile."""
