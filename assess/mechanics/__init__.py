"""Published formulas of resistance, deterioration and loads: numbers in, numbers out."""
