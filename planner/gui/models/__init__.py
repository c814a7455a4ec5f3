"""Item models over tables."""
