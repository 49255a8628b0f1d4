"""Polytopes and ellipsoids as traces, in the plane and in space, and the axes that show them without distortion."""

import numpy as np

from .look import FAINT, QUIET

_AROUND = np.linspace(0.0, 2.0 * np.pi, 121)


def drawn_polytope(polytope, name, colour, *, width, opacity=0.12, unit="mm/s"):
    """Traces of a polytope (2 or 3 rows): its edges, and in space its faces, in the same group of the legend."""
    if not len(polytope.vertices):
        return []
    edges = edges_of(polytope)
    line = {"color": colour, "width": width}
    if polytope.vertices.shape[1] == 2:
        return [{"type": "scatter", "mode": "lines", "x": edges[:, 0], "y": edges[:, 1], "name": name, "line": line, "fill": "toself", "fillcolor": faint(colour, opacity),
                 "hoveron": "points", "hovertemplate": f"corner %{{x:.4~g}}, %{{y:.4~g}} {unit}<extra></extra>"}]
    traces = [{"type": "scatter3d", "mode": "lines", "x": edges[:, 0], "y": edges[:, 1], "z": edges[:, 2], "name": name, "line": line, "legendgroup": name,
               "hovertemplate": f"%{{x:.4~g}}, %{{y:.4~g}}, %{{z:.4~g}} {unit}<extra></extra>"}]
    triangles = triangles_of(polytope)
    if len(triangles):
        x, y, z = polytope.vertices.T
        i, j, k = triangles.T
        traces.append({"type": "mesh3d", "x": x, "y": y, "z": z, "i": i, "j": j, "k": k, "color": colour, "opacity": opacity, "flatshading": True,
                       "hoverinfo": "skip", "legendgroup": name, "showlegend": False, "name": name})
    return traces


def drawn_ellipsoid(ellipsoid, name, colour):
    """Traces of an ellipsoid (2 or 3 rows): its outline in the plane; in space its three principal sections."""
    size, axes = ellipsoid.semi_axes, ellipsoid.axes * ellipsoid.semi_axes
    pairs = [(0, 1)] if len(size) == 2 else [(0, 1), (0, 2), (1, 2)]
    rings = [np.outer(np.cos(_AROUND), axes[:, a]) + np.outer(np.sin(_AROUND), axes[:, b]) for a, b in pairs]
    points = parted(rings)
    line = {"color": colour, "width": 1.8, "dash": "dash"} if len(size) == 2 else {"color": colour, "width": 2}
    if len(size) == 2:
        return [{"type": "scatter", "mode": "lines", "x": points[:, 0], "y": points[:, 1], "name": name, "line": line, "hoverinfo": "skip"}]
    return [{"type": "scatter3d", "mode": "lines", "x": points[:, 0], "y": points[:, 1], "z": points[:, 2], "name": name, "line": line, "hoverinfo": "skip"}]


def edges_of(polytope):
    """(K, m) the polytope's edges as one line, parted by rows of NaN; a flat one's as far as it has any"""
    vertices = polytope.vertices
    if not polytope.faces:
        return vertices
    if vertices.shape[1] == 2:
        (loop,) = polytope.faces
        return vertices[np.append(loop, loop[0])]
    pairs = {tuple(sorted(pair)) for face in polytope.faces for pair in zip(face.tolist(), np.roll(face, -1).tolist(), strict=True)}
    return parted([vertices[list(pair)] for pair in sorted(pairs)])


def triangles_of(polytope):
    """(T, 3) the faces as fans of triangles"""
    fans = [face[[0, i, i + 1]] for face in polytope.faces for i in range(1, len(face) - 1)]
    return np.reshape(fans, (-1, 3)).astype(int)


def parted(lines):
    """Lines (K, m) one after the other, with a row of NaN between them"""
    gap = np.full((1, lines[0].shape[1]), np.nan)
    return np.concatenate([piece for line in lines for piece in (line, gap)][:-1])


def faint(colour, opacity):
    red, green, blue = (int(colour[k : k + 2], 16) for k in (1, 3, 5))
    return f"rgba({red},{green},{blue},{opacity})"


def equal_axes(what, frame, rows, unit, labels=(), span=None):
    """Layout with one scale for both axes of a plane or all three of space. rows: the directions shown, 0 to 2; labels: annotations;
    span: how far it shows each way, all where None."""
    line, shown = {"gridcolor": FAINT, "zerolinecolor": QUIET}, {} if span is None else {"range": [-span, span]}
    if len(rows) == 2:
        x, y = ({"title": {"text": f"{what} along the {frame}'s {'XYZ'[row]}, {unit}", "standoff": 8}, "constrain": "domain", "automargin": True, **line, **shown} for row in rows)
        return {"plot_height": 460, "xaxis": x, "yaxis": {**y, "scaleanchor": "x"}, "hovermode": "closest", "annotations": list(labels)}
    axes = {f"{'xyz'[row]}axis": {"title": {"text": f"{frame} {'XYZ'[row]}, {unit}", "font": {"size": 12}}, "tickfont": {"size": 11}, "backgroundcolor": "white", **line, **shown}
            for row in rows}
    camera = {"eye": {"x": 1.35, "y": -1.7, "z": 0.85}, "center": {"x": 0, "y": 0, "z": -0.12}}
    return {"plot_height": 520, "bottom": 10, "scene": {**axes, "aspectmode": "data", "camera": camera, "annotations": list(labels)}}
