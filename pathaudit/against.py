"""What changed since an earlier report: inputs by key, the path's shape in mm, findings, and whether a signature still holds."""

from dataclasses import dataclass, replace

import numpy as np

from . import given
from .changes import matched
from .earlier import Earlier

SAME_MM = 1e-3  # a path that lies nearer to the earlier one than this has not moved: its shape is written down to 1e-4 mm
SAME_S = 1e-6
MOST_SEGMENTS = 20_000  # of the present path that the earlier places are compared with at once


@dataclass(frozen=True, repr=False)
class Against:
    """An audit compared with an earlier report. was, now: the verdicts; inputs: what is given otherwise, in words, one text a key.

    moved_mm: how far the path lies from the places that the report holds, NaN where it holds none; length_mm, duration_s: by how much they grew.
    findings: a Change each. signature: the report's, or None; void: why the signature no longer holds, in words; empty where it does.
    """

    file: str
    was: str
    now: str
    inputs: tuple
    moved_mm: float
    length_mm: float
    duration_s: float
    findings: tuple
    signature: object
    void: tuple

    @property
    def worse(self) -> bool:
        """Whether the verdict or a finding is worse than it was."""
        order = ("pass", "warn", "fail")
        return order.index(self.now) > order.index(self.was) or any(c.what in ("new", "worse") for c in self.findings)

    @property
    def same(self) -> bool:
        """Whether nothing that is compared differs."""
        return not (self.inputs or self.path_changed or self.was != self.now or any(c.what != "same" for c in self.findings))

    def __repr__(self):
        from .report.compared import compared_text

        return compared_text(self)

    def _repr_html_(self):
        from .report.compared import compared_html

        return compared_html(self)

    @property
    def path_changed(self) -> bool:
        moved = max(self.moved_mm if np.isfinite(self.moved_mm) else 0.0, abs(self.length_mm))
        return moved > SAME_MM or abs(self.duration_s) > SAME_S


def against(earlier: Earlier, audit) -> Against:
    """Compare an audit with an earlier report of the same job."""
    then, path = earlier.values, audit.path
    was = then["verdict"] if then["verdict"] in ("pass", "warn", "fail") else "fail"
    length, duration = (_difference(then["path"].get(key), value) for key, value in (("length_mm", 1e3 * path.length), ("duration_s", path.duration)))
    found = Against(
        earlier.file, was, audit.verdict, _inputs(then, audit), _moved(then["path"].get("shape_mm"), path), length, duration,
        matched(earlier.findings, audit.finding_list), earlier.signature, (),
    )  # fmt: skip
    return found if earlier.signature is None else _judged(found, earlier)


def _judged(found, earlier):
    void = [] if earlier.intact else ["the report was edited after it was signed"]
    void += found.inputs
    if found.path_changed:
        void.append(path_words(found))
    if found.was != found.now:
        void.append(f"the verdict was {found.was} and is {found.now}")
    void += [f"{c.what}: {c.words}" for c in found.findings if c.what in ("new", "worse")]
    return replace(found, void=tuple(void))


def path_words(found: Against) -> str:
    """How the path differs, in words; '' where it does not."""
    if not found.path_changed:
        return ""
    words = []
    if np.isfinite(found.moved_mm) and found.moved_mm > SAME_MM:
        words.append(f"moved by up to {found.moved_mm:.3g} mm")
    if abs(found.length_mm) > SAME_MM:
        words.append(f"{abs(found.length_mm):.3g} mm {'longer' if found.length_mm > 0 else 'shorter'}")
    if abs(found.duration_s) > SAME_S:
        words.append(f"{abs(found.duration_s):.3g} s {'longer' if found.duration_s > 0 else 'shorter'}")
    return f"the path is {' and '.join(words)}"


def _inputs(then, audit):
    """What is given otherwise: by key where the report holds the cell's values, else by the hash of the file."""
    words = []
    if then["path"].get("sha256") != audit.path.sha256:
        words.append("the path file is another (its hash differs)")
    before, now = then["cell"].get("given"), given.flat(given.cell_values(audit.cell))
    if isinstance(before, dict):
        before = given.flat(before)
        keys = [*now, *(key for key in before if key not in now)]
        return tuple(words + [_key_words(key, before.get(key), now.get(key)) for key in keys if not _equal(before.get(key), now.get(key))])
    hashes = {str(source.get("sha256")) for source in then["cell"].get("sources", []) if isinstance(source, dict)}
    words += [f"{file} is another (its hash differs)" for file, sha256 in audit.cell.sources if sha256 not in hashes]
    return tuple(words)


def _key_words(key, before, now):
    if key.endswith("sha256"):
        return f"{key.removesuffix('_sha256').replace('.', ' ')} of the arm differ" if key == "arm.links_sha256" else f"{key} differs"
    return f"{key} was {_shown(before)} and is {_shown(now)}"


def _shown(value):
    if isinstance(value, list):
        return f"({', '.join(map(_shown, value))})"
    return "not given" if value is None else f"{value:.6g}" if isinstance(value, float) else str(value)


def _equal(a, b):
    if isinstance(a, list) and isinstance(b, list):
        return len(a) == len(b) and all(map(_equal, a, b))
    numbers = all(isinstance(v, (int, float)) and not isinstance(v, bool) for v in (a, b))
    return abs(a - b) <= 1e-9 * max(1.0, abs(a), abs(b)) if numbers else a == b


def _difference(before, now):
    return now - before if isinstance(before, (int, float)) else 0.0


def _moved(shape, path):
    """mm: the largest distance of the earlier places from the present path, a chain of straight pieces; NaN where there is nothing to compare."""
    try:
        points = np.array(shape, dtype=float)
    except (TypeError, ValueError):
        return float("nan")
    if points.ndim != 2 or points.shape[1] != 3 or not np.isfinite(points).all():
        return float("nan")
    line = 1000.0 * path.position
    step = max(1, len(line) // MOST_SEGMENTS)
    line = np.concatenate([line[:-1:step], line[-1:]])
    return float(max(_to_line(point, line[:-1], np.diff(line, axis=0)) for point in points))


def _to_line(point, starts, along):
    size = np.einsum("ij,ij->i", along, along)
    share = np.clip(np.einsum("ij,ij->i", point - starts, along) / np.where(size > 0.0, size, 1.0), 0.0, 1.0)
    return np.sqrt(((starts + share[:, None] * along - point) ** 2).sum(axis=1).min())
