"""The reference network: a graph of parts, its matrices, and the error at each tap."""
