"""Share models against truth, differences and closed forms."""
