"""Transient measurements of a comparator cell: many instances at once, each number with its interval."""
