"""Tests of the invented chain and of the truth behind it."""
