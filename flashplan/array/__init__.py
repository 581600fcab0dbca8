"""All comparators together: mismatch draws, conversion of a signal, undecided comparators."""
