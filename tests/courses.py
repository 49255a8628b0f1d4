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


def random_course(rng):
    """Two to eight moves of all kinds, the tool turning or not, corners stated or left open, some of it in the air."""
    free = rng.random() < 0.5
    course = Draft("course", "", free, tuple(rng.uniform(-0.1, 0.1, 3)), 1)

    def pose():
        values = np.array([0.0, 0.0, -1.0]) + rng.normal(0, 0.3, 3) if free else np.array([0.0, 1.0, 0.0, 0.0]) + rng.normal(0, 0.15, 4)
        return course.pose(tuple(values / np.linalg.norm(values)))

    pose()
    for line in range(2, 4 + rng.integers(0, 7)):
        here = np.array(course.here)
        more = {"pose": pose() if rng.random() < 0.6 else course.pose_here, "speed": float(rng.choice([0.02, 0.1, 0.3])), "air": bool(rng.random() < 0.2)}
        zone, end, kind = float(rng.choice([np.nan, 0.0, 0.003, 0.02])), here + rng.normal(0, rng.choice([0.003, 0.05]), 3), rng.integers(0, 4)
        if kind == 0:
            course.line_to(tuple(end), line, zone=zone, **more)
        elif kind == 1:
            normal, sweep = rng.normal(size=3), rng.uniform(0.05, 2.0 * np.pi)
            normal /= np.linalg.norm(normal)
            out = np.cross(normal, rng.normal(0, 0.05, 3))
            out *= max(1.0, 0.002 / np.linalg.norm(out))
            end = here - out + out * np.cos(sweep) + np.cross(normal, out) * np.sin(sweep) + normal * rng.choice([0.0, 0.01])
            course.arc_about(tuple(end), tuple(here - out), tuple(normal), sweep, line, zone=zone, **more)
        elif kind == 2:
            course.curve_to(tuple(end), line, **more)
        else:
            course.dwell(0.1, line)
    return course.finish()
