"""What lies in the middle of many draws, and around it, along the path."""

from dataclasses import dataclass

import numpy as np

from ..conventions import owned

SHARES = (0.05, 0.5, 0.95)
MOST_DRAWS, MOST_SAMPLES = 1000, 1000  # that are kept for it: 28 MB with six joints


@dataclass(frozen=True, eq=False)
class Bands:
    """sample (K,): numbers of samples. sigma_min, busiest (3, K), speed_share (3, K, n): of the draws 5, 50 and 95 % lie at or below, at each sample by
    itself; speed_share is each joint's, of its limit, busiest the largest of them.

    Where a pose is not reached in so many draws, sigma_min is 0 and the shares are infinite.
    """

    sample: np.ndarray
    sigma_min: np.ndarray
    busiest: np.ndarray
    speed_share: np.ndarray

    def at(self, samples) -> "Bands":
        """The bands at the sample numbers (M,), straight between those that are kept; NaN beside infinite ones."""
        return Bands(owned(np.asarray(samples)), *(owned(self._between(samples, rows)) for rows in (self.sigma_min, self.busiest, self.speed_share)))

    def _between(self, samples, rows):
        flat = np.moveaxis(rows, 1, -1).reshape(-1, len(self.sample))
        with np.errstate(invalid="ignore"):
            there = np.stack([np.interp(samples, self.sample, row) for row in flat])
        return np.moveaxis(there.reshape(*np.moveaxis(rows, 1, -1).shape[:-1], -1), -1, 1)


def kept_samples(rates) -> np.ndarray:
    """(K,) numbers of the samples that bands are kept at: evenly spaced, with the places of the worst."""
    samples = len(rates.sigma_min)
    even = np.linspace(0, samples - 1, min(samples, MOST_SAMPLES)).astype(int)
    peaks = [np.nanargmin(rates.sigma_min)] if np.isfinite(rates.sigma_min).any() else []
    peaks += [np.nanargmax(share) for share in rates.speed_share.T if np.isfinite(share).any()]
    return np.unique(np.concatenate([even, np.array(peaks, dtype=int)]))


def kept_draws(draws) -> np.ndarray:
    """(M,) bool: the draws that bands are made of, evenly spaced"""
    kept = np.zeros(draws, bool)
    kept[np.linspace(0, draws - 1, min(draws, MOST_DRAWS)).astype(int)] = True
    return kept


def bands(sample, sigma, share) -> Bands:
    """Of sigma (M, K) and share (M, K, n), in which zero and infinity stand for what is not reached."""
    return Bands(owned(sample), *(owned(_quantiles(values).astype(float)) for values in (sigma, np.maximum.reduce([*np.moveaxis(share, 2, 0)]), share)))


def _quantiles(values):
    """(3, ...): values that were drawn, not means of two of them, which infinity would spoil."""
    at = [min(len(values) - 1, int(np.ceil(share * len(values))) - 1) for share in SHARES]
    rows = np.ascontiguousarray(values.reshape(len(values), -1).T)
    rows.sort(axis=1)  # a third of the time of finding the three alone
    return rows[:, at].T.reshape(len(at), *values.shape[1:])
