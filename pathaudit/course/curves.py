"""Smooth curves: the C2 cubic spline through points, and the quintic between two ends with given tangents and curvatures."""

import numpy as np


def spline(points, chords):
    """The C2 cubic spline through points (n, c), n >= 2, whose knots are the cumulated `chords` (n - 1,) > 0 -> (n - 1, 4, c).

    Coefficients in ascending powers of the share 0..1 of each interval. Ends without a knot at the second and the last but one point
    (de Boor, A Practical Guide to Splines, 1978, chapter IV); a parabola through three points, a straight line through two. With the
    distances between the points as chords the error falls with their fourth power (Floater & Surazhsky, Parameterization for curve
    interpolation, 2006, for chord-length knots).
    """
    points, h = np.asarray(points, dtype=np.float64), np.asarray(chords, dtype=np.float64)[:, None]
    secant = np.diff(points, axis=0) / h
    slope = _slopes(secant, h)
    first, last = slope[:-1] * h, slope[1:] * h
    step = secant * h
    return np.stack([points[:-1], first, 3.0 * step - 2.0 * first - last, first + last - 2.0 * step], axis=1)


def _slopes(secant, h):
    """(n, c) the spline's derivative at its knots."""
    n = len(h) + 1
    if n == 2:
        return np.concatenate([secant, secant])
    if n == 3:
        middle = (h[1] * secant[0] + h[0] * secant[1]) / (h[0] + h[1])
        return np.stack([2.0 * secant[0] - middle, middle, 2.0 * secant[1] - middle])
    below, on, above = h[1:].copy(), 2.0 * (h[:-1] + h[1:]), h[:-1].copy()
    right = 3.0 * (h[1:] * secant[:-1] + h[:-1] * secant[1:])
    start, end = _end_side(secant[0], secant[1], h[0], h[1]), _end_side(secant[-1], secant[-2], h[-1], h[-2])
    # the end rows h1 m0 + (h0 + h1) m1 = start are put into their neighbours, which leaves a matrix that its diagonal dominates
    on[0] -= h[0] + h[1]
    on[-1] -= h[-1] + h[-2]
    right[0] -= start
    right[-1] -= end
    below[0] = above[-1] = 0.0
    inner = tridiagonal(below, on, above, right)
    first, last = (start - (h[0] + h[1]) * inner[0]) / h[1], (end - (h[-1] + h[-2]) * inner[-1]) / h[-2]
    return np.concatenate([first[None], inner, last[None]])


def _end_side(nearest, next_one, h0, h1):
    return ((h0 + 2.0 * (h0 + h1)) * h1 * nearest + h0**2 * next_one) / (h0 + h1)


def tridiagonal(below, on, above, right):
    """Solve below[i] x[i-1] + on[i] x[i] + above[i] x[i+1] = right[i], (n, 1) and (n, c), for a matrix that its diagonal dominates.

    Parallel cyclic reduction (Hockney 1965; Hockney & Jesshope 1981): log2 n passes over whole arrays.
    """
    step, n = 1, len(on)
    while step < n:
        low, high = np.zeros_like(on), np.zeros_like(on)
        low[step:] = -below[step:] / on[:-step]
        high[:-step] = -above[:-step] / on[step:]
        new_on, new_right = on.copy(), right.copy()
        new_below, new_above = np.zeros_like(on), np.zeros_like(on)
        new_on[step:] += low[step:] * above[:-step]
        new_right[step:] += low[step:] * right[:-step]
        new_below[step:] = low[step:] * below[:-step]
        new_on[:-step] += high[:-step] * below[step:]
        new_right[:-step] += high[:-step] * right[step:]
        new_above[:-step] = high[:-step] * above[step:]
        below, on, above, right = new_below, new_on, new_above, new_right
        step *= 2
    return right / on


def joining_quintic(start, end, tangents, bends):
    """Quintics (k, 6, 3) from start to end (k, 3) with the unit tangents and curvature vectors (1/m) given at both, (k, 3) pairs.

    Hermite's quintic with p' = L T and p'' = L^2 K at both ends, so that curvature is continuous (Farin, Curves and Surfaces for CAGD,
    on G2 joins). L is the length of the circular arc over the same chord that turns as far as the tangents do: between straight
    lines the parameter then runs nearly evenly and the curvature rises to one peak, 1.19 (at 90 deg) to 1.5 times that of the circle that
    touches the lines at the same points.
    """
    length = arc_over(np.linalg.norm(end - start, axis=1), angle_between(*tangents))[:, None]
    slope0, slope1 = tangents[0] * length, tangents[1] * length
    bend0, bend1 = bends[0] * length**2, bends[1] * length**2
    step = end - start - slope0 - 0.5 * bend0  # what the terms of third to fifth degree have to give: value, slope, bend at 1
    slope, bend = slope1 - slope0 - bend0, bend1 - bend0
    cubic = 10.0 * step - 4.0 * slope + 0.5 * bend
    fourth = -15.0 * step + 7.0 * slope - bend
    fifth = 6.0 * step - 3.0 * slope + 0.5 * bend
    return np.stack([start, slope0, 0.5 * bend0, cubic, fourth, fifth], axis=1)


def arc_over(chord, turn):
    """(k,) length of a circular arc over a chord (k,) that turns by `turn` (k,) rad, below a full turn."""
    return chord / np.sinc(turn / (2.0 * np.pi))


def angle_between(first, second):
    """(k,) rad in 0..pi between unit vectors (k, 3): twice the arc tangent keeps the digits of small angles and of those near pi."""
    return 2.0 * np.arctan2(np.linalg.norm(second - first, axis=-1), np.linalg.norm(second + first, axis=-1))
