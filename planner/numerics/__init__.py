"""Grouped sums, draws and solvers without retail words."""
