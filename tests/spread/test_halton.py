"""The scrambled Halton sequence against SciPy's."""

import numpy as np
import pytest
from scipy.stats import kstest, qmc

from pathaudit.spread.halton import digits, halton, primes, radical_inverse


def test_the_plain_sequence_is_scipys():
    np.testing.assert_array_equal(halton(3000, 43), qmc.Halton(43, scramble=False).random(3000))


def test_with_scipys_permutations_the_scrambled_one_is_scipys_too():
    reference = qmc.Halton(12, scramble=True, rng=np.random.default_rng(4))
    tables, points = reference._permutations, reference.random(2000)
    for column, (base, table) in enumerate(zip(primes(12), tables, strict=True)):
        assert table.shape == (digits(base), base)
        np.testing.assert_array_equal(radical_inverse(2000, base, table), points[:, column])


def test_primes():
    assert primes(10) == [2, 3, 5, 7, 11, 13, 17, 19, 23, 29]
    assert halton(5, 0).shape == (5, 0)


def test_the_same_generator_gives_the_same_points_and_another_gives_others():
    one, same, other = (halton(50, 7, np.random.default_rng(seed)) for seed in (3, 3, 4))
    np.testing.assert_array_equal(one, same)
    assert (one != other).mean() > 0.9


@pytest.mark.parametrize("dimensions", [2, 6, 13])
def test_points_fill_the_cube_more_evenly_than_random_ones(dimensions):
    random = np.random.default_rng(1)
    own = np.mean([qmc.discrepancy(halton(200, dimensions, np.random.default_rng(k))) for k in range(100)])
    theirs = np.mean([qmc.discrepancy(qmc.Halton(dimensions, rng=np.random.default_rng(k)).random(200)) for k in range(100)])
    plain = np.mean([qmc.discrepancy(random.random((200, dimensions))) for _ in range(100)])
    assert own < 0.7 * plain and own == pytest.approx(theirs, rel=0.1)


def test_a_scrambled_point_is_uniform_whichever_it_is():
    first = np.array([halton(3, 5, np.random.default_rng(seed))[[0, 2]] for seed in range(2000)])
    for point in range(2):
        for column in range(5):
            assert kstest(first[:, point, column], "uniform").pvalue > 1e-3
    assert ((first >= 0.0) & (first < 1.0)).all()
