"""Tests of the command line's contract."""
