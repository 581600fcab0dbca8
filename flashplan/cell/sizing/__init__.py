"""Sizing a clocked cell: linearised model, optimiser, confirmation by the bench."""
