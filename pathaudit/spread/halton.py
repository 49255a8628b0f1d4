"""Points that fill a cube more evenly than random ones: the Halton sequence with scrambled digits.

J. H. Halton, "On the efficiency of certain quasi-random sequences of points", Numerische Mathematik 2 (1960). Scrambling: A. B. Owen, "A randomized
Halton algorithm in R", arXiv:1706.02808 (2017): each digit of each coordinate goes through a random permutation of its own. Every point is then
uniform in the cube, so that averages are unbiased, and the spread between independent scramblings tells how far an average may be off.
"""

import numpy as np


def primes(count):
    """The first `count` primes."""
    found, number = [], 2
    while len(found) < count:
        if all(number % p for p in found):
            found.append(number)
        number += 1
    return found


def digits(base):
    """How many digits matter in a double."""
    return int(np.ceil(54.0 / np.log2(base))) - 1


def permutations(base, random=None):
    """(digits, base): a permutation of the base's digits for each place, drawn from the generator `random`, or without one in their own order."""
    plain = np.tile(np.arange(base), (digits(base), 1))
    return plain if random is None else random.permuted(plain, axis=1)


def radical_inverse(count, base, tables):
    """(count,) in [0, 1): the numbers 0, 1, 2 ... with their digits in `base` permuted by tables (digits, base) and mirrored at the point."""
    rest, out, place = np.arange(count), np.zeros(count), 1.0 / base
    for table in tables:
        out += table[rest % base] * place
        rest //= base
        place /= base
    return np.minimum(out, np.nextafter(1.0, 0.0))


def halton(count, dimensions, random=None):
    """(count, dimensions) in [0, 1): the first points of the sequence, scrambled with the NumPy generator `random`, plain without one."""
    columns = [radical_inverse(count, base, permutations(base, random)) for base in primes(dimensions)]
    return np.stack(columns, axis=1) if columns else np.zeros((count, 0))
