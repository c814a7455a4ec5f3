"""What the history can tell, and how well the models predict it."""
