"""formulas of the trade on SI floats: numpy and scipy only, keyword arguments only."""
