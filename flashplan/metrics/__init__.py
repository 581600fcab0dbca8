"""Pure functions on numbers: linearity, yield, spectrum, intervals, rare events."""
