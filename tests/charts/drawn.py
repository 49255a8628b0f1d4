"""What a chart shows, read back from its traces."""

import numpy as np


def points(figure, name):
    """(K, 2 or 3) of the lines of the trace whose name starts so"""
    trace = next(t for t in figure.data if t.name.startswith(name))
    found = np.stack([np.asarray(trace[letter], dtype=float) for letter in ("xyz" if "3d" in trace.type else "xy")], axis=1)
    return found[np.isfinite(found).all(axis=1)]


def furthest_out(hull, inner):
    """How far the furthest of the points `inner` stands outside of a SciPy hull; negative where all are inside"""
    return np.max(hull.equations[:, :-1] @ inner.T + hull.equations[:, -1:])
