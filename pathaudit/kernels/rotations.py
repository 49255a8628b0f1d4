"""Rotations and rigid poses on arrays. Plain NumPy; every function takes any leading batch shape.

A rotation matrix takes coordinates in the turned frame to coordinates in the fixed one: its columns are the turned axes.
Quaternions are (w, x, y, z). `rpy` are rotations about the fixed X, then Y, then Z axes: R = Rz Ry Rx.
"""

import numpy as np


def cos_sin_deg(angle_deg):
    """Cosine and sine of degrees, exact at quarter turns (cos 90 is 0, not 6e-17)."""
    angle = np.asarray(angle_deg, dtype=np.float64)
    quarter = np.round(angle / 90.0)
    rest = np.deg2rad(angle - 90.0 * quarter)
    cos, sin = np.cos(rest), np.sin(rest)
    turn = np.mod(quarter, 4.0)
    odd = np.mod(quarter, 2.0) == 1.0
    cos, sin = np.where(odd, -sin, cos), np.where(odd, cos, sin)
    back = turn >= 2.0
    # + 0.0 turns -0.0 into 0.0
    return np.where(back, -cos, cos) + 0.0, np.where(back, -sin, sin) + 0.0


def _fixed_xyz(cos, sin):
    (cx, cy, cz), (sx, sy, sz) = np.moveaxis(cos, -1, 0), np.moveaxis(sin, -1, 0)
    rows = [
        [cz * cy, cz * sy * sx - sz * cx, cz * sy * cx + sz * sx],
        [sz * cy, sz * sy * sx + cz * cx, sz * sy * cx - cz * sx],
        [-sy, cy * sx, cy * cx],
    ]
    return np.stack([np.stack(row, axis=-1) for row in rows], axis=-2)


def matrix_from_rpy(rpy):
    """(..., 3) rad -> (..., 3, 3)."""
    rpy = np.asarray(rpy, dtype=np.float64)
    return _fixed_xyz(np.cos(rpy), np.sin(rpy))


def matrix_from_rpy_deg(rpy_deg):
    """(..., 3) degrees -> (..., 3, 3), exact at quarter turns."""
    return _fixed_xyz(*cos_sin_deg(rpy_deg))


def rpy_from_matrix(matrix):
    """(..., 3, 3) -> (..., 3) rad, y within +/-90 degrees. Where y is +/-90 degrees only x -/+ z is defined: then z is 0."""
    m = np.asarray(matrix, dtype=np.float64)
    cy = np.hypot(m[..., 0, 0], m[..., 1, 0])
    regular = cy > 1e-12
    x = np.where(regular, np.arctan2(m[..., 2, 1], m[..., 2, 2]), np.arctan2(-m[..., 1, 2], m[..., 1, 1]))
    y = np.arctan2(-m[..., 2, 0], cy)
    z = np.where(regular, np.arctan2(m[..., 1, 0], m[..., 0, 0]), 0.0)
    return np.stack([x, y, z], axis=-1)


def matrix_from_wxyz(quaternion, out=None):
    """Unit quaternions (..., 4) -> (..., 3, 3), written into `out` where one is given; entry by entry, which is fast on long paths."""
    w, x, y, z = np.moveaxis(np.asarray(quaternion, dtype=np.float64), -1, 0)
    out = np.empty((*w.shape, 3, 3)) if out is None else out
    xx, yy, zz, xy, xz, yz, wx, wy, wz = x * x, y * y, z * z, x * y, x * z, y * z, w * x, w * y, w * z
    rows = ((1 - 2 * (yy + zz), 2 * (xy - wz), 2 * (xz + wy)), (2 * (xy + wz), 1 - 2 * (xx + zz), 2 * (yz - wx)), (2 * (xz - wy), 2 * (yz + wx), 1 - 2 * (xx + yy)))
    for i, row in enumerate(rows):
        for j, entry in enumerate(row):
            out[..., i, j] = entry
    return out


def wxyz_from_matrix(matrix):
    """(..., 3, 3) -> unit quaternions (..., 4) with w >= 0.

    4 q q^T is linear in the matrix; its row with the largest diagonal entry gives q without loss of digits at any angle
    (S. W. Shepperd, Quaternion from rotation matrix, J. Guidance and Control 1(3), 1978).
    """
    m = np.asarray(matrix, dtype=np.float64)
    xx, yy, zz = m[..., 0, 0], m[..., 1, 1], m[..., 2, 2]
    wx, wy, wz = m[..., 2, 1] - m[..., 1, 2], m[..., 0, 2] - m[..., 2, 0], m[..., 1, 0] - m[..., 0, 1]
    xy, xz, yz = m[..., 0, 1] + m[..., 1, 0], m[..., 0, 2] + m[..., 2, 0], m[..., 1, 2] + m[..., 2, 1]
    rows = [
        [1 + xx + yy + zz, wx, wy, wz],
        [wx, 1 + xx - yy - zz, xy, xz],
        [wy, xy, 1 - xx + yy - zz, yz],
        [wz, xz, yz, 1 - xx - yy + zz],
    ]
    outer = np.stack([np.stack(row, axis=-1) for row in rows], axis=-2)
    best = np.argmax(np.diagonal(outer, axis1=-2, axis2=-1), axis=-1)
    q = np.take_along_axis(outer, best[..., None, None], axis=-2)[..., 0, :]
    q = q / np.linalg.norm(q, axis=-1, keepdims=True)
    return np.where(q[..., :1] < 0, -q, q)


def multiply_wxyz(left, right):
    """Quaternion product, (..., 4) by (..., 4): the turn `right`, then the turn `left`, both about fixed axes."""
    a, b, c, d = np.moveaxis(np.asarray(left, dtype=np.float64), -1, 0)
    w, x, y, z = np.moveaxis(np.asarray(right, dtype=np.float64), -1, 0)
    parts = a * w - b * x - c * y - d * z, a * x + b * w + c * z - d * y, a * y + c * w + d * x - b * z, a * z + d * w + b * y - c * x
    return np.stack(parts, axis=-1)


def continuous_wxyz(quaternion):
    """(N, 4) with signs chosen so that neighbours have a dot product >= 0: q and -q are the same rotation."""
    q = np.asarray(quaternion, dtype=np.float64)
    flips = np.sum(q[1:] * q[:-1], axis=-1) < 0
    sign = np.concatenate([[1.0], 1.0 - 2.0 * (np.cumsum(flips) % 2)])
    return q * sign[:, None]


def exp_vector(vector):
    """Rotation vectors (..., 3), rad -> (..., 3, 3).

    Rodrigues with sin(x)/x and (1 - cos x)/x^2 = (sin(x/2)/(x/2))^2 / 2: nothing cancels, so no switch at small angles.
    """
    v = np.asarray(vector, dtype=np.float64)
    angle = np.linalg.norm(v, axis=-1)[..., None, None]
    k = cross_matrix(v)
    return np.eye(3) + np.sinc(angle / np.pi) * k + 0.5 * np.sinc(angle / (2 * np.pi)) ** 2 * (k @ k)


def log_matrix(matrix):
    """(..., 3, 3) -> rotation vectors (..., 3), rad, of length 0 to pi. At pi one of the two signs is returned."""
    q = wxyz_from_matrix(matrix)
    length = np.linalg.norm(q[..., 1:], axis=-1, keepdims=True)
    # below 1e-100 the square of the length underflows, and 2 atan(x)/x is 2 to the last bit long before
    tiny = length < 1e-100
    scale = np.where(tiny, 2.0, 2.0 * np.arctan2(length, q[..., :1]) / np.where(tiny, 1.0, length))
    return scale * q[..., 1:]


def cross_matrix(vector):
    """(..., 3) -> (..., 3, 3) with cross_matrix(a) @ b = a x b."""
    v = np.asarray(vector, dtype=np.float64)
    k = np.zeros(v.shape[:-1] + (3, 3))
    k[..., 2, 1], k[..., 0, 2], k[..., 1, 0] = v[..., 0], v[..., 1], v[..., 2]
    return k - np.swapaxes(k, -1, -2)


def turn_z_onto(axis):
    """Unit vectors (..., 3) -> (..., 3, 3): a turn that brings +Z onto each, exact for the six axis directions.

    The least turn where the vector points up, I + K + K^2 / (1 + z); half a turn about X first where it points down, so
    that 1 + z never gets small.
    """
    a = np.asarray(axis, dtype=np.float64)
    down = a[..., 2:] < 0
    half_turn = np.array([1.0, -1.0, -1.0])
    up = np.where(down, a * half_turn, a)
    k = cross_matrix(np.cross([0.0, 0.0, 1.0], up))
    turn = np.eye(3) + k + k @ k / (1.0 + up[..., 2])[..., None, None]
    return np.where(down[..., None], half_turn[:, None] * turn, turn) + 0.0


def least_turn_wxyz(start, end):
    """Unit vectors (..., 3), (..., 3) -> quaternions (..., 4) of the smallest turn from `start` onto `end`.

    Opposite vectors leave the axis open: a turn about an axis square to `start` is returned.
    """
    start, end = np.broadcast_arrays(np.asarray(start, dtype=np.float64), np.asarray(end, dtype=np.float64))
    q = np.concatenate([1.0 + np.sum(start * end, axis=-1, keepdims=True), np.cross(start, end)], axis=-1)
    length = np.linalg.norm(q, axis=-1, keepdims=True)
    opposite = length < 1e-7
    square = np.concatenate([np.zeros_like(length), turn_z_onto(start)[..., :, 0]], axis=-1)
    return np.where(opposite, square, q / np.where(opposite, 1.0, length))


def frame_on_axis(axis):
    """Unit vector (3,) -> (3, 3): the frame with this +Z whose X is as close to the fixed X as can be (else to the fixed Y)."""
    z = np.asarray(axis, dtype=np.float64)
    near = np.array([1.0, 0.0, 0.0]) if abs(z[0]) < 0.9 else np.array([0.0, 1.0, 0.0])
    x = near - z * (near @ z)
    x /= np.linalg.norm(x)
    return np.stack([x, np.cross(z, x), z], axis=-1)


def carry_frames(axes):
    """Unit vectors (N, 3) -> (N, 3, 3): frames whose +Z follow `axes`, each reached from the one before by the least turn.

    The products of all turns so far are formed by doubling (log2 N passes over the whole array), then what rounding left
    between each +Z and its axis is turned away.
    """
    axes = np.asarray(axes, dtype=np.float64)
    product = np.concatenate([wxyz_from_matrix(frame_on_axis(axes[0]))[None], least_turn_wxyz(axes[:-1], axes[1:])])
    step = 1
    while step < len(product):
        product = np.concatenate([product[:step], multiply_wxyz(product[step:], product[:-step])])
        step *= 2
    product /= np.linalg.norm(product, axis=-1, keepdims=True)
    rest = least_turn_wxyz(matrix_from_wxyz(product)[..., 2], axes)
    return matrix_from_wxyz(multiply_wxyz(rest, product))


def pose(rotation, position):
    """(..., 3, 3) and (..., 3) -> (..., 4, 4)."""
    rotation, position = np.asarray(rotation, dtype=np.float64), np.asarray(position, dtype=np.float64)
    out = np.zeros(np.broadcast_shapes(rotation.shape[:-2], position.shape[:-1]) + (4, 4))
    out[..., :3, :3], out[..., :3, 3], out[..., 3, 3] = rotation, position, 1.0
    return out


def inverse_pose(matrix):
    """Rigid poses (..., 4, 4) -> their inverses."""
    m = np.asarray(matrix, dtype=np.float64)
    back = np.swapaxes(m[..., :3, :3], -1, -2)
    return pose(back, -(back @ m[..., :3, 3:])[..., 0])
