"""Thermometer code to word: gate netlists, one module per scheme, cost, comparison."""
