"""The invented chain: its exported files, the generator that wrote them, and the truth behind them."""
