"""Unbroken runs of what is marked along a path."""

import numpy as np


def runs(mask, gap=0) -> np.ndarray:
    """(K, 2) first and last number of each run of True in mask (N,); runs with at most `gap` others between them are one."""
    inside = np.flatnonzero(mask)
    if not len(inside):
        return np.empty((0, 2), int)
    cuts = np.flatnonzero(np.diff(inside) > gap + 1)
    return np.stack([inside[np.r_[0, cuts + 1]], inside[np.r_[cuts, -1]]], axis=1)
