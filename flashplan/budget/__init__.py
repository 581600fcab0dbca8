"""How much each comparator may spend: one module per kind of limit."""
