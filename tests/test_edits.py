"""Edits as values: painting, cutting, locks, what is accepted and declined."""

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from pathaudit.edits import Adopt, Decline, Edits, Lock, Slow

N = 40
SUGGESTED = {"local": np.linspace(0.3, 1.0, N)}
stretches = st.tuples(st.integers(0, N - 1), st.integers(0, N - 1)).map(sorted)
edits = st.builds(
    lambda ends, kind, factor: {"slow": Slow(*ends, factor), "adopt": Adopt(*ends, "local"), "lock": Lock(*ends), "decline": Decline(*ends)}[kind],
    stretches, st.sampled_from(["slow", "adopt", "lock", "decline"]), st.floats(0.05, 1.0),
)  # fmt: skip
lines = st.lists(edits, max_size=8).map(lambda items: Edits(tuple(items)))


def painted(items):
    """The same by the plainest means: sample by sample, the last edit of speed that covers it."""
    factor, locked = np.ones(N), np.zeros(N, bool)
    for item in items:
        for k in range(item.first, item.last + 1):
            if isinstance(item, Slow):
                factor[k] = item.factor
            elif isinstance(item, Adopt):
                factor[k] = SUGGESTED["local"][k]
            elif isinstance(item, Lock):
                locked[k] = True
    return factor, locked


def asked(value):
    slowed, adopted, locked = value.factors(N, SUGGESTED)
    assert ((slowed == 1.0) | (adopted == 1.0)).all()
    return np.minimum(slowed, adopted), locked


@given(lines)
def test_later_edits_paint_over_earlier_ones(value):
    for got, wanted in zip(asked(value), painted(value.items), strict=True):
        np.testing.assert_array_equal(got, wanted)


@given(lines, edits)
def test_what_an_edit_hides_may_be_dropped(value, edit):
    for got, wanted in zip(asked(value.plus(edit)), painted((*value.items, edit)), strict=True):
        np.testing.assert_array_equal(got, wanted)


def test_dragging_does_not_pile_up():
    value = Edits()
    for percent in range(90, 20, -1):
        value = value.plus(Slow(5, 9, percent / 100))
    assert value.items == (Slow(5, 9, 0.21),)


@given(lines, stretches)
def test_taking_back_a_stretch_leaves_the_rest(value, ends):
    inside = np.zeros(N, bool)
    inside[ends[0] : ends[1] + 1] = True
    (was, was_locked), (factor, locked) = asked(value), asked(value.freed(*ends))
    assert (factor[inside] == 1.0).all() and not locked[inside].any()
    np.testing.assert_array_equal(factor[~inside], was[~inside])
    np.testing.assert_array_equal(locked[~inside], was_locked[~inside])


@given(lines, stretches)
def test_accepted_and_rejected_are_what_they_say(value, ends):
    taken = value.accept(*ends, "local")
    assert taken.accepted(*ends) and not taken.declined(*ends)
    refused = taken.reject(*ends)
    assert refused.declined(*ends) and not refused.accepted(*ends)
    assert refused.accept(*ends, "local").accepted(*ends)


def test_a_stretch_slowed_by_hand_is_no_longer_as_suggested():
    value = Edits().accept(0, N - 1, "local")
    assert value.accepted(3, 8)
    assert not value.plus(Slow(5, 5, 0.5)).accepted(3, 8)
    assert value.plus(Slow(20, 30, 0.5)).accepted(3, 8)
    assert not Edits() and value
