"""What an arm can give at one posture: speeds, forces and joint steps, from its Jacobian alone.

J is (m, n): m task rows, n joints, in any units; cut out the rows that a question is about first (`J[:3]` for the tool centre
point).  A `direction` is used as it is given, not normalised: the answer t says that the task vector t * direction is just
possible.  With a unit vector t is a speed or a force, with the programmed twist it is the reserve.

Under joint limits |qd_i| <= speed_i the speeds J qd fill a zonotope, the sum of the segments [-1, 1] * speed_i * J_i.  Two of
its properties answer everything here: it reaches h(y) = sum_i speed_i |y . J_i| along y, and each of its facets is parallel to
m - 1 of the columns (G. M. Ziegler, Lectures on Polytopes, 1995, section 7.3; used for the wrenches of cables as the
hyperplane-shifting method by S. Bouchard, C. Gosselin, B. Moore, ASME J. Mechanisms and Robotics 2(1), 2010).
"""

from itertools import combinations
from typing import NamedTuple

import numpy as np

ROUND_OFF = 1e-11  # relative: a length or a singular value below it counts as zero


class Ellipsoid(NamedTuple):
    """Columns of `axes` (m, m) are unit vectors; `semi_axes` (m,) belong to them, longest first (inf where nothing limits)."""

    axes: np.ndarray
    semi_axes: np.ndarray


class Polytope(NamedTuple):
    """`vertices` (V, m), none where the polytope is empty; `faces`: indices into them, one array a face, counter-clockwise seen from
    outside (in the plane: one loop); `size`: the area (m = 2) or volume (m = 3), zero when the polytope is flat."""

    vertices: np.ndarray
    faces: tuple[np.ndarray, ...]
    size: float


# ---------------------------------------------------------------------------------------------------------------------- speeds


def velocity_ellipsoid(J) -> Ellipsoid:
    """Task speeds from joint speeds of Euclidean length at most 1; `velocity_ellipsoid(J * speed)` counts in shares of the limits.

    T. Yoshikawa, Int. J. Robotics Research 4(2), 1985.
    """
    J = _jacobian(J)
    axes, sigma, _ = np.linalg.svd(J)
    return Ellipsoid(axes, np.pad(_without_round_off(sigma), (0, len(J) - len(sigma))))


def largest_component(J, direction, speed) -> float:
    """Largest J qd . direction over |qd| <= speed, wherever else the tool goes meanwhile.  Not a limit for following a path."""
    J, speed = _jacobian(J, speed)
    return float(np.abs(_direction(J, direction) @ J) @ speed)


def largest_speed(J, direction, speed) -> float:
    """Largest t with J qd = t * direction for some |qd| <= speed (n,): how fast the tool can go exactly that way.

    For a square regular J this is min_i speed_i / |(J^-1 direction)_i|.  With more joints than task rows it is a linear
    programme, answered exactly: the ray leaves the zonotope through the facet whose h(y) / |y . direction| is least.
    Zero where the posture cannot move that way.
    """
    J, speed = _jacobian(J, speed)
    direction = _direction(J, direction)
    G, seen = _within_range(J * speed, direction)
    if seen is None:
        return 0.0
    normals = _facet_normals(G)
    across = np.abs(normals @ seen)
    crossed = across > ROUND_OFF * np.linalg.norm(seen)
    return float(np.min(np.abs(normals[crossed] @ G).sum(axis=1) / across[crossed]))


def velocity_polytope(J, speed) -> Polytope:
    """All task speeds under |qd| <= speed (n,), for 2 or 3 task rows: the convex hull of the images of the joint-speed box."""
    J, speed = _jacobian(J, speed)
    if len(J) not in (2, 3):
        raise ValueError(f"a velocity polytope has 2 or 3 task rows, found J of shape {J.shape}")
    G = _without_parallels((J * speed).T)
    if len(G) < 2:  # a point or a segment
        signs, faces = np.tile([[1.0], [-1.0]], (1, len(G)))[: 2 ** len(G)], ()
    elif len(J) == 2:
        signs = _loop(G)
        faces = (np.arange(len(signs)),)
    else:
        signs, faces = _spatial_hull(G)
    return Polytope(signs @ G, faces, _zonotope_size(G))


def velocity_cut(J, speed, shown, twist) -> Polytope:
    """Speeds of the task rows `shown` (2 or 3 row numbers) under |qd| <= speed (n,), while every other row goes as in twist (m,).

    The plane or spatial cut of the zonotope of all rows: twist lies in it just where the joints can do the whole of twist, which
    `velocity_polytope(J[shown], speed)`, where the other rows go as they like, does not tell. What the posture cannot do of twist is
    left out of it. Empty where no speed fits, and where the posture does not leave all shown rows free.
    """
    J, speed = _jacobian(J, speed)
    shown = np.asarray(shown, dtype=int)
    held = np.setdiff1d(np.arange(len(J)), shown)
    whole, twist = velocity_polytope(J[shown], speed), _task_vector(J, twist, "twist")
    if not np.isfinite(twist).all():
        raise ValueError(f"a twist is finite, found {twist}")
    if not len(held):
        return whole
    left, sigma, _ = np.linalg.svd(J * speed)
    basis = left[:, : np.count_nonzero(_without_round_off(sigma))]
    _, kept, right = np.linalg.svd(basis[held])
    free = right[np.count_nonzero(kept > ROUND_OFF) :].T
    if free.shape[1] < len(shown) or whole.size == 0.0:
        return Polytope(np.empty((0, len(shown))), (), 0.0)
    # the vectors of J's range with the held rows of twist are start + across v, v the speeds that are shown
    across = free @ np.linalg.inv(basis[shown] @ free)
    start = basis.T @ twist - across @ (basis[shown] @ (basis.T @ twist))
    normals, G = _facet_normals(basis.T @ (J * speed)), basis.T @ (J * speed)
    reach, slopes, offset = np.abs(normals @ G).sum(axis=1), normals @ across, normals @ start
    return _clipped(whole, np.concatenate([slopes, -slopes]), np.concatenate([reach - offset, reach + offset]))


# ---------------------------------------------------------------------------------------------------------------------- forces


def force_ellipsoid(J) -> Ellipsoid:
    """Forces f whose joint efforts J^T f have Euclidean length at most 1: the axes of the velocity ellipsoid, semi-axes inverted."""
    axes, sigma = velocity_ellipsoid(J)
    with np.errstate(divide="ignore"):
        return Ellipsoid(axes[:, ::-1], (1.0 / sigma)[::-1])


def largest_force(J, direction, effort) -> float:
    """Largest t for which the tool can press with t * direction at standstill, gravity apart: |J^T (t direction)| <= effort (n,).

    inf where the structure alone carries the load.
    """
    J, effort = _jacobian(J, effort)
    load = np.abs(_direction(J, direction) @ J)
    loaded = load > ROUND_OFF * np.linalg.norm(load)
    return float(np.min(effort[loaded] / load[loaded], initial=np.inf))


def force_polytope(J, effort, most) -> Polytope:
    """All forces f with |J^T f| <= effort (n,), gravity apart, for 2 or 3 task rows, and no component above `most`, which ends the
    polytope where the structure alone carries the load."""
    J, effort = _jacobian(J, effort)
    if len(J) not in (2, 3):
        raise ValueError(f"a force polytope has 2 or 3 task rows, found J of shape {J.shape}")
    box = velocity_polytope(np.eye(len(J)), most)
    return _clipped(box, np.concatenate([J.T, -J.T]), np.concatenate([effort, effort]))


# ----------------------------------------------------------------------------------------------------------------- joint steps


def damped_step(J, v, damping) -> np.ndarray:
    """Joint step (n,) by damped least squares, J^T (J J^T + damping^2 I)^-1 v; zero damping gives the least-norm step.

    `damping` is one number, or one for each singular direction, longest first: (0, .., 0, beta) is numerical filtering, which
    damps the direction about to be lost and no other.  Of the demand along a direction u, damping^2 / (sigma^2 + damping^2)
    is left undone.
    C. W. Wampler, IEEE Trans. SMC-16(1), 1986; Y. Nakamura, H. Hanafusa, ASME J. DSMC 108(3), 1986; numerical filtering:
    A. A. Maciejewski, C. A. Klein, J. Robotic Systems 5(6), 1988.
    """
    left, sigma, right = np.linalg.svd(_jacobian(J), full_matrices=False)
    sigma = _without_round_off(sigma)
    gain = np.divide(sigma, sigma**2 + np.square(damping), out=np.zeros_like(sigma), where=sigma > 0)
    return right.T @ (gain * (left.T @ np.asarray(v, dtype=float)))


def weighted_step(J, v, weights) -> np.ndarray:
    """Joint step (n,) that does J qd = v with the least sum of weights_i qd_i^2: W^-1 J^T (J W^-1 J^T)^-1 v.

    D. E. Whitney, IEEE Trans. MMS-10(2), 1969.  A singular J gives the nearest v that it can do.
    """
    J, weights = _jacobian(J, weights)
    root = np.sqrt(weights)
    return damped_step(J / root, v, 0.0) / root


def damping_by_manipulability(w, threshold, largest):
    """Damping largest * (1 - w / threshold) below the threshold of manipulability, none above (Nakamura & Hanafusa 1986)."""
    return largest * np.clip(1.0 - np.asarray(w) / threshold, 0.0, None)


def damping_by_singular_value(sigma_min, threshold, largest):
    """Damping largest * sqrt(1 - (sigma_min / threshold)^2) below the threshold, none above.

    A. A. Maciejewski, C. A. Klein, J. Robotic Systems 5(6), 1988; S. Chiaverini, IEEE Trans. Robotics and Automation 13(3), 1997.
    """
    return largest * np.sqrt(np.clip(1.0 - np.square(np.asarray(sigma_min) / threshold), 0.0, None))


# -------------------------------------------------------------------------------------------------------------- single numbers


def manipulability(J) -> float:
    """sqrt(det(J J^T)), the product of the singular values (Yoshikawa 1985).  In the units of J: not comparable between arms."""
    return float(np.prod(velocity_ellipsoid(J).semi_axes))


def frobenius_condition(J) -> float:
    """sqrt(tr(J J^T) tr((J J^T)^-1)) / m: 1 where isotropic, inf where singular (W. A. Khan, J. Angeles, ASME J. Mech. Design
    128(1), 2006).  Means nothing unless every row of J has the same unit: divide the linear rows by a stated length first."""
    sigma = velocity_ellipsoid(J).semi_axes
    if not sigma.all():
        return float("inf")
    return float(np.sqrt(np.sum(sigma**2) * np.sum(sigma**-2.0)) / len(sigma))


# ------------------------------------------------------------------------------------------------------------------- zonotopes


def _without_round_off(sigma):
    return np.where(sigma > ROUND_OFF * sigma[0], sigma, 0.0)


def _within_range(G, direction):
    """G (m, n) and direction in coordinates of G's range, so that G has full row rank; None for a direction outside that range."""
    left, sigma, _ = np.linalg.svd(G)
    basis = left[:, : np.count_nonzero(_without_round_off(sigma))]
    seen = basis.T @ direction
    outside = np.linalg.norm(direction - basis @ seen)
    return basis.T @ G, None if outside > ROUND_OFF * np.linalg.norm(direction) else seen


def _facet_normals(G):
    """Unit vectors (k, m) across m - 1 columns of G (m, n) each, for every choice of columns; each opposite pair once.

    Among them are the normals of all facets. Where the chosen columns span less, the vector is one of many across them: no
    facet's normal, but h(y) / |y . direction| is an upper bound of the speed for any y, so it does no harm.
    """
    choices = np.array(list(combinations(range(G.shape[1]), len(G) - 1)), dtype=int)
    lengths = np.linalg.norm(G, axis=0)
    columns = np.moveaxis((G / np.where(lengths > 0, lengths, 1.0))[:, choices], 1, 0)
    return np.linalg.svd(columns)[0][..., -1]


def _without_parallels(G):
    """Generators (k, m) as rows, zero ones dropped and parallel ones added up: then each vertex has one pattern of signs."""
    kept = []
    for g in G[np.linalg.norm(G, axis=1) > ROUND_OFF * np.abs(G).max(initial=0.0)]:
        for i, other in enumerate(kept):
            along = g @ other / (other @ other)
            if np.linalg.norm(g - along * other) <= ROUND_OFF * np.linalg.norm(g):
                kept[i] = other + np.copysign(1.0, along) * g
                break
        else:
            kept.append(g)
    return np.reshape(kept, (-1, G.shape[1]))


def _loop(G):
    """Signs (2k, k) of the vertices of a planar zonotope, generators (k, 2) without parallels, counter-clockwise."""
    up = np.where((G[:, 1] > 0) | ((G[:, 1] == 0) & (G[:, 0] > 0)), 1.0, -1.0)
    order = np.argsort(np.arctan2(up * G[:, 1], up * G[:, 0]))
    rank = np.argsort(order)
    rising = np.where(rank < np.arange(len(G))[:, None], 1.0, -1.0) * up
    return np.concatenate([rising, -rising])


def _spatial_hull(G):
    """Signs (V, k) of the vertices and the faces of a zonotope with k >= 2 generators (k, 3) without parallels.

    Every face lies across the normal of two generators, and is the planar zonotope of all those in that plane, moved out by
    the others.
    """
    vertices, faces = {}, []
    lengths = np.linalg.norm(G, axis=1)
    for i, j in combinations(range(len(G)), 2):
        normal = np.cross(G[i], G[j])
        height = G @ normal
        inside = np.flatnonzero(np.abs(height) <= ROUND_OFF * lengths * np.linalg.norm(normal))
        if (inside[0], inside[1]) != (i, j):
            continue  # the same plane came with an earlier pair
        for side in (1.0, -1.0):
            first, second = G[i], np.cross(side * normal, G[i])
            loop = _loop(G[inside] @ np.stack([first / np.linalg.norm(first), second / np.linalg.norm(second)], axis=1))
            signs = np.tile(np.sign(side * height), (len(loop), 1))
            signs[:, inside] = loop
            faces.append(np.array([vertices.setdefault(tuple(s), len(vertices)) for s in signs]))
    return np.array(list(vertices)), tuple(faces)


def _zonotope_size(G):
    """Area or volume for generators (k, m): 2^m times the sum of |det| over all choices of m (G. C. Shephard, Mathematika 21, 1974)."""
    m = G.shape[1]
    choices = np.array(list(combinations(range(len(G)), m)), dtype=int).reshape(-1, m)
    return float(2.0**m * np.abs(np.linalg.det(G[choices])).sum())


# ---------------------------------------------------------------------------------------------------------------- convex solids


def _clipped(polytope, normals, heights):
    """What is left of a polytope (not flat) of the half-spaces normals (k, m) @ x <= heights (k,)."""
    vertices, faces = polytope.vertices, list(polytope.faces)
    size = np.abs(vertices).max()
    for normal, height in zip(normals, heights, strict=True):
        length = np.linalg.norm(normal)
        over = vertices @ normal - height
        near = 1e3 * ROUND_OFF * size * length
        if len(over) and over.max() > near:
            vertices, faces = _cut_off(vertices, faces, over, near, normal)
    return Polytope(vertices, tuple(faces), _enclosed(vertices, faces))


def _cut_off(vertices, faces, over, near, normal):
    """Vertices and faces without the side where over (V,) is positive; |over| <= near counts as on the cut."""
    points, number, rim, kept = [], {}, set(), []

    def place(key, point):
        if key not in number:
            number[key] = len(points)
            points.append(point)
        return number[key]

    for face in faces:
        loop = []
        for i, j in zip(face.tolist(), np.roll(face, -1).tolist(), strict=True):
            if over[i] <= near:
                loop.append(place(i, vertices[i]))
                if over[i] >= -near:
                    rim.add(loop[-1])
            if (over[i] > near and over[j] < -near) or (over[j] > near and over[i] < -near):
                i, j = min(i, j), max(i, j)  # the same point from both faces at this edge
                share = over[i] / (over[i] - over[j])
                loop.append(place((i, j), vertices[i] + share * (vertices[j] - vertices[i])))
                rim.add(loop[-1])
        if len(loop) > 2 and not rim.issuperset(loop):
            kept.append(np.array(loop))
    points = np.reshape(points, (-1, len(normal)))
    if not kept:
        return points[:0], []
    if len(normal) == 3:
        kept.append(_rim(points, np.array(sorted(rim)), normal))
    used, back = np.unique(np.concatenate(kept), return_inverse=True)
    return points[used], np.split(back, np.cumsum([len(face) for face in kept])[:-1])


def _rim(points, rim, normal):
    """The points of a flat convex rim in their order, counter-clockwise seen against the normal."""
    from_middle = points[rim] - points[rim].mean(axis=0)
    first = from_middle[np.argmax(np.linalg.norm(from_middle, axis=1))]
    second = np.cross(normal, first) / np.linalg.norm(normal)
    return rim[np.argsort(np.arctan2(from_middle @ second, from_middle @ first))]


def _enclosed(vertices, faces):
    """Area or volume inside faces that are turned outwards (divergence theorem)."""
    if not faces:
        return 0.0
    if vertices.shape[1] == 2:
        x, y = vertices[faces[0]].T
        return float((x @ np.roll(y, -1) - y @ np.roll(x, -1)) / 2.0)
    fans = [np.linalg.det(vertices[face[[0, i, i + 1]]]) for face in faces for i in range(1, len(face) - 1)]
    return float(sum(fans) / 6.0)


# -------------------------------------------------------------------------------------------------------------------- arguments


def _jacobian(J, per_joint=None):
    """J as (m, n) float64, with the per-joint numbers (n,), all finite; else ValueError with what was found."""
    J = np.asarray(J, dtype=float)
    if J.ndim != 2 or 0 in J.shape:
        raise ValueError(f"a Jacobian has the shape (task rows, joints), found {J.shape}")
    if not np.isfinite(J).all():
        raise ValueError("the Jacobian holds NaN or infinity: there is no posture to judge")
    if per_joint is None:
        return J
    per_joint = np.broadcast_to(np.asarray(per_joint, dtype=float), J.shape[1:])
    if not (np.isfinite(per_joint).all() and (per_joint >= 0).all()):
        raise ValueError(f"one finite number, not negative, is needed for each of the {J.shape[1]} joints, found {per_joint}")
    return J, per_joint


def _direction(J, direction):
    direction = _task_vector(J, direction, "direction")
    if not (np.isfinite(direction).all() and direction.any()):
        raise ValueError(f"a direction is finite and not zero, found {direction}")
    return direction


def _task_vector(J, vector, word):
    vector = np.asarray(vector, dtype=float)
    if vector.shape != J.shape[:1]:
        raise ValueError(f"J has {len(J)} task rows, found a {word} of shape {vector.shape}")
    return vector
