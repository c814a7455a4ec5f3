"""View-neutral result tables."""
