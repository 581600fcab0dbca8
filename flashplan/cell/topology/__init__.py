"""The comparator circuits that can be sized: one module each, and their names."""
