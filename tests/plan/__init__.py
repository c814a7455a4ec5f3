"""Tests of planner.plan."""
