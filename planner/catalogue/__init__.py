"""Items, segments, stores and clusters."""
