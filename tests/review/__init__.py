"""Tests of the open range review."""
