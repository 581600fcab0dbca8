"""Plan the comparator array of a flash or subranging A/D converter."""
