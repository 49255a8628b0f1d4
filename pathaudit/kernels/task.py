"""The task of one pose in the axes of the tool: what is left to it, the Jacobian of its rows, and the linear systems of a step.

Three linear rows divided by the characteristic length stand first, then two or three angular rows, so that leaving out the last row
leaves the spin about the tool's +Z free.
"""

from math import atan2, sqrt

from .compiled import helper


@helper
def rotation_log(r, out):
    """Fill out (3,) with the rotation vector of r (3, 3), angle in [0, pi]."""
    x, y, z = 0.5 * (r[2, 1] - r[1, 2]), 0.5 * (r[0, 2] - r[2, 0]), 0.5 * (r[1, 0] - r[0, 1])
    square = x * x + y * y + z * z
    cosine = 0.5 * (r[0, 0] + r[1, 1] + r[2, 2] - 1.0)
    if square < 1e-4 and cosine > 0.0:
        # asin(s) / s to s^6; the next term, 35 s^8 / 1152, is below 4e-18 here
        scale = 1.0 + square * (1.0 / 6.0 + square * (3.0 / 40.0 + square * (15.0 / 336.0)))
        out[0], out[1], out[2] = x * scale, y * scale, z * scale
        return
    sine = sqrt(square)
    angle = atan2(sine, cosine)
    if sine > 1e-6 or cosine > 0.0:
        scale = angle / sine
        out[0], out[1], out[2] = x * scale, y * scale, z * scale
        return
    # Close to half a turn the sine says nothing of the axis; the symmetric part does, up to a sign that then does not matter.
    i = 0
    for j in range(1, 3):
        if r[j, j] > r[i, i]:
            i = j
    length = 0.0
    for j in range(3):
        out[j] = 0.5 * (r[i, j] + r[j, i]) + (1.0 if i == j else 0.0)
        length += out[j] * out[j]
    for j in range(3):
        out[j] *= angle / sqrt(length)


@helper
def pose_error(tool, position, rotation, rows, inverse_length, spare, error):
    """Fill error (6,) in tool axes, what is left from tool (3, 4) to the target; return its distance in m and its angle in rad."""
    dx, dy, dz = position[0] - tool[0, 3], position[1] - tool[1, 3], position[2] - tool[2, 3]
    for i in range(3):
        error[i] = (tool[0, i] * dx + tool[1, i] * dy + tool[2, i] * dz) * inverse_length
    if rows == 6:
        for i in range(3):
            for j in range(3):
                spare[i, j] = tool[0, i] * rotation[0, j] + tool[1, i] * rotation[1, j] + tool[2, i] * rotation[2, j]
        rotation_log(spare, error[3:6])
    else:
        ax = tool[0, 0] * rotation[0, 2] + tool[1, 0] * rotation[1, 2] + tool[2, 0] * rotation[2, 2]
        ay = tool[0, 1] * rotation[0, 2] + tool[1, 1] * rotation[1, 2] + tool[2, 1] * rotation[2, 2]
        az = tool[0, 2] * rotation[0, 2] + tool[1, 2] * rotation[1, 2] + tool[2, 2] * rotation[2, 2]
        sine = sqrt(ax * ax + ay * ay)
        angle = atan2(sine, az)
        if sine > 1e-12:
            error[3], error[4] = -ay * angle / sine, ax * angle / sine
        else:  # opposite axes: any turn will do
            error[3], error[4] = angle, 0.0
        error[5] = 0.0
    return sqrt(dx * dx + dy * dy + dz * dz), sqrt(error[3] * error[3] + error[4] * error[4] + error[5] * error[5])


@helper
def in_tool_axes(v, tool, inverse_length, out):
    """Fill out (6,) with the twist v (6,) in the axes of tool (3, 4), linear rows times inverse_length."""
    for i in range(3):
        out[i] = (tool[0, i] * v[0] + tool[1, i] * v[1] + tool[2, i] * v[2]) * inverse_length
        out[3 + i] = tool[0, i] * v[3] + tool[1, i] * v[4] + tool[2, i] * v[5]


@helper
def task_jacobian(prismatic, axes, origins, tool, rows, inverse_length, jacobian):
    """Fill jacobian (rows, n) in tool axes, linear rows times inverse_length."""
    t00, t10, t20 = tool[0, 0], tool[1, 0], tool[2, 0]
    t01, t11, t21 = tool[0, 1], tool[1, 1], tool[2, 1]
    t02, t12, t22 = tool[0, 2], tool[1, 2], tool[2, 2]
    px, py, pz = tool[0, 3], tool[1, 3], tool[2, 3]
    for i in range(prismatic.shape[0]):
        x, y, z = axes[i, 0], axes[i, 1], axes[i, 2]
        ax, ay, az = t00 * x + t10 * y + t20 * z, t01 * x + t11 * y + t21 * z, t02 * x + t12 * y + t22 * z
        if prismatic[i]:
            jacobian[0, i], jacobian[1, i], jacobian[2, i] = ax * inverse_length, ay * inverse_length, az * inverse_length
            ax = ay = az = 0.0
        else:
            x, y, z = (px - origins[i, 0]) * inverse_length, (py - origins[i, 1]) * inverse_length, (pz - origins[i, 2]) * inverse_length
            dx, dy, dz = t00 * x + t10 * y + t20 * z, t01 * x + t11 * y + t21 * z, t02 * x + t12 * y + t22 * z
            jacobian[0, i], jacobian[1, i], jacobian[2, i] = ay * dz - az * dy, az * dx - ax * dz, ax * dy - ay * dx
        jacobian[3, i], jacobian[4, i] = ax, ay
        if rows == 6:
            jacobian[5, i] = az


@helper
def factor(jacobian, n, work, order):
    """LU factors of the square jacobian in work (n, n), rows exchanged as order (n,) tells; return the determinant and the smallest pivot."""
    for i in range(n):
        for j in range(n):
            work[i, j] = jacobian[i, j]
    determinant, smallest = 1.0, 1e300
    for k in range(n):
        p, largest = k, abs(work[k, k])
        for i in range(k + 1, n):
            if abs(work[i, k]) > largest:
                p, largest = i, abs(work[i, k])
        order[k] = p
        if largest == 0.0:
            return 0.0, 0.0
        smallest = min(smallest, largest)
        if p != k:
            determinant = -determinant
            for j in range(n):
                work[k, j], work[p, j] = work[p, j], work[k, j]
        determinant *= work[k, k]
        inverse = 1.0 / work[k, k]
        for i in range(k + 1, n):
            work[i, k] *= inverse
            for j in range(k + 1, n):
                work[i, j] -= work[i, k] * work[k, j]
    return determinant, smallest


@helper
def substitute(work, order, right, n, out):
    """Fill out (n,) with the solution for the right side, from the factors."""
    for i in range(n):
        out[i] = right[i]
    for k in range(n):
        p = int(order[k])
        out[k], out[p] = out[p], out[k]
    for k in range(n):
        for j in range(k):
            out[k] -= work[k, j] * out[j]
    for k in range(n - 1, -1, -1):
        for j in range(k + 1, n):
            out[k] -= work[k, j] * out[j]
        out[k] /= work[k, k]


@helper
def gram(jacobian, rows, n, work):
    """Fill both halves of work (m, m), m the lesser of rows and n, with J J^T, or with J^T J where n < rows; return the trace."""
    size, trace = min(rows, n), 0.0
    for i in range(size):
        for j in range(i + 1):
            total = 0.0
            if n >= rows:
                for k in range(n):
                    total += jacobian[i, k] * jacobian[j, k]
            else:
                for k in range(rows):
                    total += jacobian[k, i] * jacobian[k, j]
            work[i, j] = work[j, i] = total
        trace += work[i, i]
    return trace


@helper
def damped_step(jacobian, right, rows, n, damping, work, spare, out):
    """Fill out (n,) with J^T (J J^T + damping I)^-1 right, or the same by the smaller normal matrix where n < rows.

    damping is the square of the damping factor; one that is lost in rounding is raised to what rounding allows.
    """
    wide = n >= rows
    size = rows if wide else n
    trace = gram(jacobian, rows, n, work)
    for i in range(size):
        if wide:
            spare[i] = right[i]
        else:
            total = 0.0
            for k in range(rows):
                total += jacobian[k, i] * right[k]
            spare[i] = total
    lift = max(damping, 1e-15 * trace + 1e-300)
    for i in range(size):
        work[i, i] += lift
        for j in range(i + 1):
            total = work[i, j]
            for k in range(j):
                total -= work[i, k] * work[j, k]
            if i == j:
                work[i, i] = sqrt(max(total, 1e-300))
            else:
                work[i, j] = total / work[j, j]
    for i in range(size):
        total = spare[i]
        for k in range(i):
            total -= work[i, k] * spare[k]
        spare[i] = total / work[i, i]
    for i in range(size - 1, -1, -1):
        total = spare[i]
        for k in range(i + 1, size):
            total -= work[k, i] * spare[k]
        spare[i] = total / work[i, i]
    for j in range(n):
        total = spare[j]
        if wide:
            total = 0.0
            for i in range(rows):
                total += jacobian[i, j] * spare[i]
        out[j] = total
