"""Smoothing of noisy samples over time: local cubic fits, with dwells held still. Plain NumPy on arrays.

At each sample a cubic is fitted to the samples within +/- `width`, with the weights 1 - u^2 (Epanechnikov), u the distance in time over the
width, and its value there is taken: local polynomial regression (J. Fan and I. Gijbels, Local Polynomial Modelling and Its Applications,
1996, section 3.1). It needs no even sampling, gives every cubic motion back as it is, and at an end it uses the one side that there is
without the bias of a moving mean (the same, section 3.2.5).
"""

import numpy as np

from ..runs import runs

HALF = 0.7532
"""Times 1/width: the frequency of which half the amplitude stays, where samples lie on both sides (from the fit's equivalent kernel,
15/32 (1 - u^2)(3 - 7 u^2), the same book, table 3.1)."""

FEWEST = 6  # samples in a window: a cubic through four is no mean
MOST = 500  # samples on each side of a window


def local_cubic(time, values, width):
    """Smoothed values (N, c) at their own times (N,), and which samples (N,) had too few neighbours and stay as they are."""
    n = len(time)
    reach = np.maximum(np.searchsorted(time, time + width, "right") - np.arange(n), np.arange(n) - np.searchsorted(time, time - width, "left") + 1)
    power, moment, count = np.zeros((7, n)), np.zeros((4, n, values.shape[1])), np.zeros(n, int)
    for offset in range(-int(reach.max()), int(reach.max()) + 1):
        here = slice(max(-offset, 0), n - max(offset, 0))
        there = slice(max(offset, 0), n - max(-offset, 0))
        u = (time[there] - time[here]) / width
        weight = np.maximum(1.0 - u * u, 0.0)
        count[here] += weight > 0
        for k in range(7):
            power[k, here] += weight * u**k
        for k in range(4):
            moment[k, here] += (weight * u**k)[:, None] * (values[there] - values[here])
    lone = count < FEWEST
    normal = np.moveaxis(power[np.add.outer(np.arange(4), np.arange(4))], -1, 0)
    normal[lone] = np.eye(4)
    fitted = np.linalg.solve(normal, np.moveaxis(moment, 0, 1))[:, 0]
    return np.where(lone[:, None], values, values + fitted), lone


def noise(values):
    """The standard deviation of the noise of evenly taken samples (N, c): the largest of the columns.

    From third differences, which the motion hardly reaches: theirs is sqrt(20) times the noise's; 1.4826 times the median is robust.
    """
    if len(values) < 8:
        return 0.0
    return float((1.4826 * np.median(np.abs(np.diff(values, 3, axis=0)), axis=0) / np.sqrt(20.0)).max())


def dwells(time, values, width, floor):
    """Stretches [(first, last)] in which the tool rests for at least 2 width.

    values (N, c): what rests, in one unit. Every sample is within 6 times the noise, at least `floor`, of the stretch's mean; the stretch ends where
    the mean of 9 samples has left that mean by a quarter of it.
    """
    near = max(floor, 6.0 * noise(values))
    ahead = np.searchsorted(time, time + width, "right") - 1
    behind = np.searchsorted(time, time - width, "left")
    still = np.linalg.norm(values[ahead] - values[behind], axis=1) <= near
    padded = np.cumsum(np.concatenate([values[:1]] * 5 + [values] + [values[-1:]] * 4), axis=0)
    calm = (padded[9:] - padded[:-9]) / 9.0
    found = []
    for first, last in runs(still):
        quarter = (last - first) // 4
        middle = values[first + quarter : last - quarter + 1].mean(axis=0)
        resting = np.linalg.norm(calm - middle, axis=1) <= near / 4.0
        if time[last] - time[first] < width or not resting[first + quarter : last - quarter + 1].all():
            continue
        low = found[-1][1] + 1 if found else 0
        centre = (first + last) // 2
        before, after = np.flatnonzero(~resting[low:centre]), np.flatnonzero(~resting[centre:])
        first = low + before[-1] + 1 if len(before) else low
        last = centre + after[0] - 1 if len(after) else len(time) - 1
        if time[last] - time[first] >= 2 * width and np.linalg.norm(values[first : last + 1] - middle, axis=1).max() <= near:
            found.append((int(first), int(last)))
    return found


def smoothed(time, values, width, rests):
    """Values (N, c) smoothed over +/- width; in each rest (first, last) they are its mean, and no window reaches over a rest's end.

    What a motion's smoothed end differs from the rest beside it is taken back over one width. Also gives the lone samples (N,).
    """
    out, lone = values.copy(), np.zeros(len(time), bool)
    for first, last in rests:
        out[first : last + 1] = values[first : last + 1].mean(axis=0)
    starts, ends = [0, *(last + 1 for _, last in rests)], [*(first for first, _ in rests), len(time)]
    for start, end in zip(starts, ends):
        if end > start:
            piece = slice(start, end)
            out[piece], lone[piece] = local_cubic(time[piece], values[piece], width)
            if start > 0:
                _meet(out[piece], time[piece] - time[start], out[start - 1], 0, width)
            if end < len(time):
                _meet(out[piece], time[end - 1] - time[piece], out[end], -1, width)
    return out, lone


def _meet(piece, away, rest, end, width):
    """Let a smoothed piece begin or end in the rest beside it: what noise is left between them fades over one width."""
    piece += np.clip(1.0 - away / width, 0.0, 1.0)[:, None] ** 2 * (rest - piece[end])
