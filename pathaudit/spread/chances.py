"""How often something happens among draws, and how far that share may be from the true one."""

from dataclasses import dataclass

import numpy as np

SCRAMBLINGS = 10  # independent ones, whose spread gives the intervals
STUDENT = 2.262157162798205  # of t with SCRAMBLINGS - 1 = 9 degrees of freedom, 97.5 %
NORMAL = 1.959963984540054  # 97.5 %
FEW = 100  # draws with, or without, an event: below it the scramblings' own spread is not to be relied on


@dataclass(frozen=True)
class Chance:
    """`share` of the draws in which an event occurs, the 95 % interval low..high of its probability, and how many draws those are."""

    share: float
    low: float
    high: float
    draws: int


def scrambling_of(draws) -> np.ndarray:
    """(draws,) which of the SCRAMBLINGS each draw belongs to: one after the other, as equal in number as can be."""
    return np.arange(draws) * SCRAMBLINGS // draws


def chance(events, scrambling) -> Chance:
    """The chance of `events` (M,) bool.

    Student's interval of the mean over independent scramblings. Where the event is rare, or its absence, the interval is widened to hold Wilson's
    as well, which takes the draws as independent: they are spread more evenly than that.
    """
    counts = np.bincount(scrambling, minlength=SCRAMBLINGS)
    shares = np.bincount(scrambling, weights=events, minlength=SCRAMBLINGS) / counts
    hits, share = int(np.sum(events)), float(np.mean(events))
    reach = STUDENT * shares.std(ddof=1) / np.sqrt(SCRAMBLINGS)
    low, high = shares.mean() - reach, shares.mean() + reach
    if min(hits, len(events) - hits) < FEW:
        rare = wilson(hits, len(events))
        low, high = min(low, rare[0]), max(high, rare[1])
    return Chance(share, float(max(low, 0.0)), float(min(high, 1.0)), hits)


def wilson(hits, draws):
    """The 95 % score interval of a probability, of `hits` in `draws` independent ones (E. B. Wilson, J. Am. Stat. Assoc. 22, 1927)."""
    share, z = hits / draws, NORMAL**2 / draws
    middle, reach = share + z / 2.0, NORMAL * np.sqrt(share * (1.0 - share) / draws + z / (4.0 * draws))
    return max((middle - reach) / (1.0 + z), 0.0), min((middle + reach) / (1.0 + z), 1.0)
