"""Runs, against the plainest way of finding them."""

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from pathaudit.runs import runs


@given(st.lists(st.booleans(), max_size=40), st.integers(0, 4))
def test_runs_are_what_walking_along_finds(mask, gap):
    found = []
    for k, marked in enumerate(mask):
        if marked and found and k - found[-1][1] <= gap + 1:
            found[-1][1] = k
        elif marked:
            found.append([k, k])
    assert runs(np.array(mask, bool), gap).tolist() == found


def test_nothing_marked_is_no_run():
    assert runs(np.zeros(7, bool)).shape == (0, 2) and runs(np.zeros(0, bool)).shape == (0, 2)
