"""The arm in the still picture: what is drawn, that it stays in its box, and that no words lie on others."""

import numpy as np
import pytest
from fake_audit import fake_audit
from posed_audit import HANGING, ON_A_WALL, TILTED, mounted, sliding

from pathaudit.report.drawn_arm import draw_arm
from pathaudit.report.scene import scene

BOXES = [(0.0, 0.0, 400.0, 300.0), (660.0, 32.0, 338.0, 640.0), (10.0, 10.0, 700.0, 900.0)]
AUDITS = {"six": lambda: fake_audit(600), "two": lambda: fake_audit(600, 2), "seven": lambda: fake_audit(600, 7), "twelve": lambda: fake_audit(600, 12),
          "one": lambda: fake_audit(2, 1), "hanging": lambda: mounted(HANGING), "wall": lambda: mounted(ON_A_WALL), "sliding": sliding}


class Recorder:
    """A surface that keeps what is drawn on it."""

    def __init__(self):
        self.lines, self.words, self.circles, self.rects = [], [], [], []

    def line(self, points, colour, width=1.0, dash=()):
        self.lines.append((np.asarray(points, dtype=float), colour, width))

    def rect(self, x, y, w, h, fill="none", stroke="none", width=1.0, dash=()):
        self.rects.append((x, y, w, h, fill, stroke))

    def circle(self, x, y, r, fill, stroke, width=1.5):
        self.circles.append((x, y, r, stroke))

    def text(self, x, y, words, colour="", align="left", size=11, bold=False):
        assert align == "left"
        self.words.append((x, y, self.text_width(words, size), words))

    def text_width(self, words, size=11):
        return 0.53 * size * len(words)


def drawn(audit, box, at=None):
    shown = scene(audit)
    surface = Recorder()
    draw_arm(surface, box, shown.facts, shown.arrays, shown.facts["shown"] // 2 if at is None else at)
    return surface


@pytest.mark.parametrize("box", BOXES)
@pytest.mark.parametrize("name", AUDITS)
def test_all_stays_in_the_box_and_words_stay_apart(name, box):
    surface = drawn(AUDITS[name](), box)
    x, y, width, height = box
    for points, _, thick in surface.lines:
        assert np.isfinite(points).all()
        assert points[:, 0].min() > x - 1e-6 and points[:, 0].max() < x + width + 1e-6
        assert points[:, 1].min() > y - 1e-6 and points[:, 1].max() < y + height + 1e-6
    boxes = [(u, v - 6, u + wide, v + 6) for u, v, wide, _ in surface.words]
    assert all(left >= x and right <= x + width and top >= y and bottom <= y + height for left, top, right, bottom in boxes)
    for k, (left, top, right, bottom) in enumerate(boxes):
        assert not any(left < r and l < right and top < b and t < bottom for l, t, r, b in boxes[:k])
    assert {"base", "part", "tool", "X", "Y", "Z"} & {words for *_, words in surface.words} >= {"part", "X"}


@pytest.mark.parametrize("placement, words", [(np.eye(4), "base"), (HANGING, "base, hanging"), (ON_A_WALL, "base, on a wall"), (TILTED, "base, tilted")])
def test_the_mounting_is_told_and_drawn(placement, words):
    surface = drawn(mounted(placement), BOXES[1])
    assert words in [said for *_, said in surface.words]
    crossed = [points for points, _, width in surface.lines if width == 1.2 and len(points) in (5, 8)]
    assert [len(points) for points in crossed] == [5 if words == "base" else 8]


def test_a_joint_that_slides_is_a_square():
    assert len([rect for rect in drawn(sliding(), BOXES[0]).rects if rect[2] == rect[3]]) == 1
    assert not [rect for rect in drawn(fake_audit(600), BOXES[0]).rects if rect[2] == rect[3]]


def test_warn_and_fail_differ_without_their_colours():
    audit = fake_audit(600)
    audit.finding_list = [f for f in audit.finding_list if f.kind == "joint speed"]
    for finding, severity in zip(audit.finding_list, ("warn", "fail")):
        finding.severity = severity
        finding.first, finding.last = (100, 200) if severity == "warn" else (300, 400)
    widths = {width: colour for points, colour, width in drawn(audit, BOXES[1]).lines if len(points) > 2}
    assert widths[3.5] != widths[5.0] and widths[1.4] == "#ffffff"


def test_what_is_not_reached_says_so():
    audit = fake_audit(600)
    place = int(np.flatnonzero(~audit.motion.reached)[3])
    surface = drawn(audit, BOXES[0], place)
    assert "not reached: no posture to draw" in [words for *_, words in surface.words]
    assert len(surface.circles) == 1
