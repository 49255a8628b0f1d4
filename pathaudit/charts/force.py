"""How hard the tool can press at a place before a drive is at its limit."""

import numpy as np

from .. import capacity
from ..errors import ModelError
from .look import GREEN, SEVERITY, for_file, lines_of, plain, turned_out
from .places import place_words, plane_rows, posture_at
from .solids import drawn_polytope, equal_axes

_MOST = 20.0  # times the force in the weakest direction: what lies beyond is not drawn
_STEPS = 4  # each edge of a face is cut into so many, for colours that follow the force


def force_capacity(audit, time=None, *, sample=None, plane=None, axes="part"):
    """The largest force that the tool can press with at standstill in each direction, from the joints' effort limits alone, N.

    The drives carry J^T f; gravity, friction and moments about the tool point are left out. In a plane the force has no component
    across it. Directions in which the structure carries far more than the drives of the weakest direction are cut off, and told.

    time (s, the nearest sample is taken) or sample: the place. plane: "xy", "xz", "yz", or None for all three directions. axes: "part"
    or "tool". Raises ValueError, and ModelError where the arm states no efforts.
    """
    import plotly.graph_objects as go

    arm, rows = audit.cell.arm, plane_rows(plane)
    _check_efforts(arm)
    posture = posture_at(audit, time, sample, axes)
    jacobian = posture.jacobian[rows]
    least, direction, joint = _weakest(jacobian, arm.effort)
    most = _MOST * least
    polytope = capacity.force_polytope(jacobian, arm.effort, most)
    traces = (_flat if plane else _spatial)(jacobian, arm, polytope, most)
    figure = go.Figure([*traces, _weak(least * direction, least, arm.joint_names[joint])])
    words = f"At {place_words(audit, posture.sample)}. Weakest{' in this plane' if plane else ''}: {least:.0f} N, with joint {arm.joint_names[joint]} at its limit. Standing still, gravity left out."
    if np.abs(polytope.vertices).max() >= most * (1 - 1e-9):
        words += f" Cut off at {most:.0f} N: beyond it the structure carries the load, not the drives."
    show = equal_axes("force", axes, rows, "N")
    return turned_out(figure, "Largest force in each direction", lines_of(words), for_file("force", plane or "3d", "sample", posture.sample), **show)


def _check_efforts(arm):
    unknown = [name for name, effort in zip(arm.joint_names, arm.effort, strict=True) if np.isnan(effort)]
    if unknown:
        wanted = "an arm that states what every drive can give (effort= of <limit> in URDF, effort_nm or effort_n in a row of the arm)"
        raise ModelError("force capacity", f"no effort limit for joint {', '.join(unknown)}", wanted)


def _weakest(jacobian, effort):
    """The least of the largest forces over all directions, its direction and the number of the joint that ends it: the drive whose slab
    |J_i . f| <= effort_i is the thinnest."""
    lengths = np.linalg.norm(jacobian, axis=0)
    if not (lengths > 1e-9).any():
        raise ValueError("a force at the tool point loads no drive in this posture, expected one that at least one joint has to hold")
    reach = np.divide(effort, lengths, out=np.full(len(effort), np.inf), where=lengths > 1e-9)
    joint = int(np.argmin(reach))
    return float(reach[joint]), jacobian[:, joint] / lengths[joint], joint


def _limiting(jacobian, effort, points):
    """For each of points (K, m) the number of the joint that is nearest to its limit."""
    return np.argmax(np.abs(points @ jacobian) / effort, axis=1)


def _words(arm, jacobian, points, most):
    sizes = np.linalg.norm(points, axis=1)
    joints = _limiting(jacobian, arm.effort, points)
    ended = np.abs(points).max(axis=1) >= most * (1 - 1e-9)
    return [f"{size:.0f} N" + (" and more" if end else f", joint {plain(arm.joint_names[j])} at its limit") for size, j, end in zip(sizes, joints, ended, strict=True)]


def _flat(jacobian, arm, polytope, most):
    """The outline, with points between the corners so that every direction has its number on hover."""
    corners = np.arctan2(polytope.vertices[:, 1], polytope.vertices[:, 0])
    angles = np.unique(np.round(np.concatenate([np.radians(np.arange(-180.0, 180.0, 2.0)), corners]), 12))
    towards = np.column_stack([np.cos(angles), np.sin(angles)])
    with np.errstate(divide="ignore"):
        reach = np.minimum((arm.effort / np.abs(towards @ jacobian)).min(axis=1), most / np.abs(towards).max(axis=1))
    points = towards * reach[:, None]
    points = np.concatenate([points, points[:1]])
    return [{"type": "scatter", "mode": "lines", "x": points[:, 0], "y": points[:, 1], "name": "largest force", "fill": "toself", "fillcolor": "rgba(0,158,115,0.15)",
             "line": {"color": GREEN, "width": 2}, "text": _words(arm, jacobian, points, most), "hoveron": "points", "hovertemplate": "%{text}<extra></extra>"}]


def _spatial(jacobian, arm, polytope, most):
    """The faces, coloured by the size of the force, and the edges."""
    points, triangles = _finer(polytope)
    x, y, z = points.T
    i, j, k = triangles.T
    bar = {"title": {"text": "largest force, N", "side": "right"}, "thickness": 14, "len": 0.8}
    mesh = {"type": "mesh3d", "x": x, "y": y, "z": z, "i": i, "j": j, "k": k, "intensity": np.linalg.norm(points, axis=1), "colorscale": "Cividis", "colorbar": bar,
            "opacity": 0.85, "flatshading": True, "text": _words(arm, jacobian, points, most), "hovertemplate": "%{text}<extra></extra>", "name": "largest force",
            "lighting": {"ambient": 0.9, "diffuse": 0.2, "specular": 0.0}}
    edges = drawn_polytope(polytope, "edges: two drives at their limits", "#1b1f24", width=3, unit="N")[0]
    return [mesh, edges]


def _finer(polytope):
    """Points (P, 3) and triangles (T, 3) of the faces, every triangle of a fan around a face's middle cut into smaller ones."""
    shares = np.array([(a, b) for a in range(_STEPS + 1) for b in range(_STEPS + 1 - a)]) / _STEPS
    number = {tuple(pair): k for k, pair in enumerate(np.rint(shares * _STEPS).astype(int).tolist())}
    small = [(number[a, b], number[a + 1, b], number[a, b + 1]) for a, b in number if a + b < _STEPS]
    small += [(number[a + 1, b], number[a + 1, b + 1], number[a, b + 1]) for a, b in number if a + b < _STEPS - 1]
    points, triangles = [], []
    for face in polytope.faces:
        loop = polytope.vertices[face]
        middle = loop.mean(axis=0)
        for first, second in zip(loop, np.roll(loop, -1, axis=0), strict=True):
            triangles.append(np.array(small) + len(points) * len(shares))
            points.append(middle + shares[:, :1] * (first - middle) + shares[:, 1:] * (second - middle))
    return np.concatenate(points), np.concatenate(triangles)


def _weak(point, size, name):
    """The weakest direction, both ways."""
    colour, flat = SEVERITY["fail"], len(point) == 2
    both = np.stack([-point, point])
    trace = {"type": "scatter" if flat else "scatter3d", "mode": "lines+markers", "name": "weakest direction", "line": {"color": colour, "width": 2 if flat else 6, "dash": "dot" if flat else "solid"},
             "marker": {"symbol": "diamond", "size": 9 if flat else 5, "color": colour}, "hovertemplate": f"weakest: {size:.0f} N, joint {plain(name)} at its limit<extra></extra>"}
    return trace | {letter: both[:, k] for k, letter in enumerate("xyz"[: len(point)])}
