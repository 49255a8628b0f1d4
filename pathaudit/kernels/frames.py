"""The frames of a serial chain at one posture, multiplied from the part to the tool, and its Jacobian.

A chain of n joints is `links` (n+1, 4, 4), the fixed transforms, and `prismatic` (n,) uint8. Joint i turns about, or slides along, the
local +z that stands after links[i]; its pose is links[0] Z(q0) links[1] ... Z(q[n-1]) links[n].
"""

import numpy as np

from .compiled import helper

# pi/2 in two parts: the first has 33 bits, so that its product with a whole number below a million is exact
QUARTER, QUARTER_REST = 1.57079632673412561417e00, 6.07710050650619224932e-11
S3, S5, S7, S9 = -1.0 / 6.0, 1.0 / 120.0, -1.0 / 5040.0, 1.0 / 362880.0
S11, S13, S15 = -1.0 / 39916800.0, 1.0 / 6227020800.0, -1.0 / 1307674368000.0
C4, C6, C8, C10 = 1.0 / 24.0, -1.0 / 720.0, 1.0 / 40320.0, -1.0 / 3628800.0
C12, C14, C16 = 1.0 / 479001600.0, -1.0 / 87178291200.0, 1.0 / 20922789888000.0


@helper
def turn(angle):
    """Cosine and sine of a joint angle below a million turns, to two units in the last place.

    Taylor series about the nearest quarter turn: with |x| <= pi/4 the first terms left out are 5e-17 (x^17 / 17!) and 2e-18 (x^18 / 18!).
    Both at once, in line, cost a third of two calls of the library.
    """
    k = np.rint(angle * 0.6366197723675814)
    x = (angle - k * QUARTER) - k * QUARTER_REST
    y = x * x
    z = y * y
    w = z * z
    s = x + x * y * ((S3 + y * S5) + z * (S7 + y * S9) + w * ((S11 + y * S13) + z * S15))
    c = 1.0 - 0.5 * y + z * ((C4 + y * C6) + z * (C8 + y * C10) + w * ((C12 + y * C14) + z * C16))
    quarter = int(k) & 3
    if quarter & 1:
        c, s = -s, c
    if quarter & 2:
        c, s = -c, -s
    return c, s


@helper
def place(links, prismatic, q, axes, origins, tool):
    """Fill axes (n, 3) and origins (n, 3) of the joints and tool (3, 4), the pose of the chain's end, all in the chain's first frame."""
    n = prismatic.shape[0]
    # elements one by one: a slice of `links` in the loop would count references, at the price of the arithmetic
    r00, r01, r02, x = links[0, 0, 0], links[0, 0, 1], links[0, 0, 2], links[0, 0, 3]
    r10, r11, r12, y = links[0, 1, 0], links[0, 1, 1], links[0, 1, 2], links[0, 1, 3]
    r20, r21, r22, z = links[0, 2, 0], links[0, 2, 1], links[0, 2, 2], links[0, 2, 3]
    for i in range(n):
        axes[i, 0], axes[i, 1], axes[i, 2] = r02, r12, r22
        origins[i, 0], origins[i, 1], origins[i, 2] = x, y, z
        if prismatic[i]:
            x += r02 * q[i]
            y += r12 * q[i]
            z += r22 * q[i]
        else:
            c, s = turn(q[i])
            r00, r01 = c * r00 + s * r01, c * r01 - s * r00
            r10, r11 = c * r10 + s * r11, c * r11 - s * r10
            r20, r21 = c * r20 + s * r21, c * r21 - s * r20
        k = i + 1
        m00, m10, m20 = links[k, 0, 0], links[k, 1, 0], links[k, 2, 0]
        m01, m11, m21 = links[k, 0, 1], links[k, 1, 1], links[k, 2, 1]
        m02, m12, m22 = links[k, 0, 2], links[k, 1, 2], links[k, 2, 2]
        px, py, pz = links[k, 0, 3], links[k, 1, 3], links[k, 2, 3]
        x += r00 * px + r01 * py + r02 * pz
        y += r10 * px + r11 * py + r12 * pz
        z += r20 * px + r21 * py + r22 * pz
        r00, r01, r02 = r00 * m00 + r01 * m10 + r02 * m20, r00 * m01 + r01 * m11 + r02 * m21, r00 * m02 + r01 * m12 + r02 * m22
        r10, r11, r12 = r10 * m00 + r11 * m10 + r12 * m20, r10 * m01 + r11 * m11 + r12 * m21, r10 * m02 + r11 * m12 + r12 * m22
        r20, r21, r22 = r20 * m00 + r21 * m10 + r22 * m20, r20 * m01 + r21 * m11 + r22 * m21, r20 * m02 + r21 * m12 + r22 * m22
    tool[0, 0], tool[0, 1], tool[0, 2], tool[0, 3] = r00, r01, r02, x
    tool[1, 0], tool[1, 1], tool[1, 2], tool[1, 3] = r10, r11, r12, y
    tool[2, 0], tool[2, 1], tool[2, 2], tool[2, 3] = r20, r21, r22, z


@helper
def columns(prismatic, axes, origins, tool, jacobian):
    """Fill jacobian (6, n), linear rows first, at the tool point in the axes of the chain's first frame."""
    px, py, pz = tool[0, 3], tool[1, 3], tool[2, 3]
    for i in range(prismatic.shape[0]):
        ax, ay, az = axes[i, 0], axes[i, 1], axes[i, 2]
        if prismatic[i]:
            jacobian[0, i], jacobian[1, i], jacobian[2, i] = ax, ay, az
            jacobian[3, i], jacobian[4, i], jacobian[5, i] = 0.0, 0.0, 0.0
        else:
            dx, dy, dz = px - origins[i, 0], py - origins[i, 1], pz - origins[i, 2]
            jacobian[0, i], jacobian[1, i], jacobian[2, i] = ay * dz - az * dy, az * dx - ax * dz, ax * dy - ay * dx
            jacobian[3, i], jacobian[4, i], jacobian[5, i] = ax, ay, az
