"""What lies in the middle of many draws, and around it, along the path."""

from dataclasses import dataclass

import numpy as np

from ..conventions import owned

SHARES = (0.05, 0.5, 0.95)
MOST_DRAWS, MOST_SAMPLES = 2000, 2000  # that are kept for it: 32 MB


@dataclass(frozen=True, eq=False)
class Bands:
    """sample (K,): numbers of samples. sigma_min, speed_share (3, K): of the draws 5, 50 and 95 % lie at or below; speed_share is the busiest joint's.

    Where a pose is not reached in so many draws, sigma_min is 0 and speed_share infinite.
    """

    sample: np.ndarray
    sigma_min: np.ndarray
    speed_share: np.ndarray

    def at(self, samples):
        """sigma_min and speed_share (3, M) at the sample numbers (M,), straight between those that are kept."""
        with np.errstate(invalid="ignore"):
            return tuple(np.stack([np.interp(samples, self.sample, row) for row in rows]) for rows in (self.sigma_min, self.speed_share))


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
    """Of sigma, share (M, K), in which infinity stands for what is not reached."""
    return Bands(owned(sample), *(owned(_quantiles(values).astype(float)) for values in (sigma, share)))


def _quantiles(values):
    """(3, K): values that were drawn, not means of two of them, which infinity would spoil."""
    at = [min(len(values) - 1, int(np.ceil(share * len(values))) - 1) for share in SHARES]
    return np.partition(values, at, axis=0)[at]
