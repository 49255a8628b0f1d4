"""Audits under tolerances, made once."""

import pytest
from tolerant_cells import EVERY, near_a_limit

from pathaudit.spread.study import study


@pytest.fixture(scope="session")
def six():
    """A six-joint arm a little below its limits, every kind of tolerance stated"""
    return near_a_limit(2, **EVERY)


@pytest.fixture(scope="session")
def studied(six):
    return study(six, draws=300, seed=7)
