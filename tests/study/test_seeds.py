"""One stream for each chunk."""

import numpy as np

from flashplan.study.seeds import chunk_generator


def test_a_chunk_draws_as_the_spawned_child_of_its_index() -> None:
    children = np.random.SeedSequence(12).spawn(6)
    for index, child in enumerate(children):
        expected = np.random.default_rng(child).normal(size=8)
        np.testing.assert_array_equal(
            chunk_generator(12, index).normal(size=8), expected
        )


def test_seeds_and_chunks_do_not_share_a_stream() -> None:
    firsts = {
        chunk_generator(seed, index).integers(2**63)
        for seed in range(20)
        for index in range(20)
    }
    assert len(firsts) == 400
