"""Does the method hold what it says? Invented elections, the whole way, against the truth behind them."""
