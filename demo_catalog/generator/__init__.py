"""Parts of the generator of the demo catalogue."""
