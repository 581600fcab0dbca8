"""Trials in chunks: seeds, workers, checkpoints."""
