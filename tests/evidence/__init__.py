"""What the history can tell."""
