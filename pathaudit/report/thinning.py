"""Which samples of a long path are drawn: few enough to send and to hold, chosen so that no peak is lost."""

import numpy as np

from ..runs import runs


def kept_samples(series, most, always=()):
    """Sample numbers, increasing, at most `most` of them.

    series (N, S): what is drawn; NaN where there is nothing. The path is cut into equal pieces and each piece keeps the place of the
    least and of the greatest value of every series. `always`: sample numbers that stay whatever happens, the more important first.
    """
    samples = len(series)
    if samples <= most:
        return np.arange(samples)
    columns = np.ascontiguousarray(series.T)
    empty = np.isnan(columns)
    low, high = np.where(empty, np.inf, columns), np.where(empty, -np.inf, columns)
    anchors = np.unique(np.clip(np.r_[0, samples - 1, np.asarray(always, dtype=int)[: most // 2]], 0, samples - 1))
    pieces = most // 2
    while True:
        kept = np.union1d(_extremes(low, high, pieces), anchors)
        if len(kept) <= most or pieces == 1:
            break
        pieces = max(1, min(pieces - 1, int(0.97 * pieces * most / len(kept))))
    return kept if len(kept) <= most else anchors


def kept_of_path(reached, series, most, always=()):
    """`kept_samples` of a path: infinite values are nothing, and the samples on both sides of where poses are not reached, reached (N,), stay."""
    edges = runs(~reached)
    always = [*always, *edges.ravel(), *(edges[:, 0] - 1), *(edges[:, 1] + 1)]
    return kept_samples(np.where(np.isfinite(series), series, np.nan), most, always)


def _extremes(low, high, pieces):
    """Where each of `pieces` pieces has its least of low (S, N) and its greatest of high; the last piece may be shorter."""
    series, samples = low.shape
    size = -(-samples // pieces)
    whole = samples // size * size
    starts, found = np.arange(0, whole, size), []
    for values, place in ((low, np.argmin), (high, np.argmax)):
        found.append(starts + place(values[:, :whole].reshape(series, -1, size), axis=2))
        if whole < samples:
            found.append(whole + place(values[:, whole:], axis=1, keepdims=True))
    return np.unique(np.concatenate([places.ravel() for places in found]))


def spans(mask, time, gap):
    """(K, 2) start and end times of the runs of mask; each reaches half way to its neighbours, and runs nearer than `gap` (s) are joined."""
    borders = np.r_[time[0], 0.5 * (time[1:] + time[:-1]), time[-1]]
    found = runs(mask)
    if not len(found):
        return np.empty((0, 2))
    starts, ends = borders[found[:, 0]], borders[found[:, 1] + 1]
    apart = starts[1:] - ends[:-1] > gap
    return np.stack([starts[np.r_[True, apart]], ends[np.r_[apart, True]]], axis=1)
