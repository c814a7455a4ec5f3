"""The five pages, blind to each other."""
