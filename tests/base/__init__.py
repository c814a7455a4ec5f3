"""Tests of the shared frame."""
