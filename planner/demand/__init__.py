"""Share models, their estimation and their tests."""
