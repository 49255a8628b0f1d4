"""Joint sines in line against 40-digit arithmetic, and what `locate` refuses."""

import mpmath
import numpy as np
import pytest
from called import called

from pathaudit.kernels import frames, linkage


def test_cosine_and_sine_to_two_units_in_the_last_place():
    random, turn = np.random.default_rng(4), called(frames.turn)
    angles = np.r_[random.uniform(-7, 7, 3000), random.uniform(-1e4, 1e4, 500), np.arange(-16, 17) * np.pi / 4, 0.0, -0.0, 1e-300]
    with mpmath.workdps(40):
        for angle in angles:
            exact = mpmath.cos(mpmath.mpf(float(angle))), mpmath.sin(mpmath.mpf(float(angle)))
            for found, wanted in zip(turn(angle), exact, strict=True):
                assert abs(float(wanted - mpmath.mpf(found))) < 4.5e-16


@pytest.mark.parametrize("links, q", [((3, 4, 4), (5, 3)), ((4, 4, 4), (5, 2)), ((4, 4, 4), (3,))])
def test_a_wrong_shape_is_named(links, q):
    with pytest.raises(ValueError, match=r"shape .* expected"):
        linkage.locate(np.zeros(links), np.zeros(3, np.uint8), np.zeros(q))
