"""Courses to test with, and what plain differences of samples say about a motion."""

import numpy as np

from pathaudit.course import Draft

DOWN = (0.0, 0.0, -1.0)


def draft(begin=(0.0, 0.0, 0.0), axis=DOWN):
    """A course that begins at a point, the tool held at one axis."""
    course = Draft("course", "", True, tuple(begin), 1)
    course.pose(tuple(axis))
    return course


def polyline(points, speed=0.1, **more):
    """Straight lines through points (n, 3) m."""
    course = draft(points[0])
    for line, point in enumerate(points[1:], 2):
        course.line_to(tuple(point), line, speed=speed, **more)
    return course.finish()


def speeds(path):
    """(N - 1,) m/s between samples."""
    return np.linalg.norm(np.diff(path.position, axis=0), axis=1) / np.diff(path.time)


def accelerations(path):
    """(N - 2,) m/s2 by second differences of unevenly timed samples."""
    velocity = np.diff(path.position, axis=0) / np.diff(path.time)[:, None]
    return np.linalg.norm(np.diff(velocity, axis=0), axis=1) / (0.5 * (path.time[2:] - path.time[:-2]))


def turn_rates(path):
    """(N - 1, 3) rad/s between samples, in part axes."""
    from pathaudit.kernels.rotations import log_matrix

    turn = log_matrix(np.swapaxes(path.rotation[:-1], 1, 2) @ path.rotation[1:])
    return np.einsum("nij,nj->ni", path.rotation[:-1], turn) / np.diff(path.time)[:, None]
