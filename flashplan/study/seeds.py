"""One random stream for each chunk of a study, by index alone."""

import numpy as np


def chunk_generator(seed: int, index: int) -> np.random.Generator:
    """Return the generator of chunk `index` of a study with this seed.

    It is the one that SeedSequence(seed) would spawn as its child number `index`, made without the children before it:
    which worker runs the chunk, and when, changes nothing.
    Source: M. E. O'Neill's seed sequences as numpy.random.SeedSequence has them (spawn_key).

    >>> child = np.random.SeedSequence(1).spawn(8)[7]
    >>> int(np.random.default_rng(child).integers(1000) - chunk_generator(1, 7).integers(1000))
    0
    """
    sequence = np.random.SeedSequence(seed, spawn_key=(index,))
    return np.random.Generator(np.random.PCG64(sequence))
