"""The still picture of an audit, for readers without a running kernel: timeline and arm side by side on a white ground."""

from .drawn_arm import draw_arm
from .drawn_close import draw_windows, height_of_windows, windows_of
from .drawn_rows import Places, draw_rows, shortened
from .surfaces import INK, SEVERITY, SOFT, Bitmap, Svg

_WIDTH, _ROWS = 1000, 650


def svg_picture(shown, title=True, notes=()):
    """The picture of a Scene as SVG text. `title=False` leaves out the line of text at its top; placed notes are flags, numbered as they come."""
    return _picture(Svg, shown, title, notes)


def png_picture(shown, title=True, notes=()):
    """The same picture as PNG bytes, 1.5 pixels for each CSS pixel."""
    return _picture(Bitmap, shown, title, notes)


def shown_sample(facts):
    """The kept sample that the arm is drawn at: the first finding that fails, else the first finding, else the middle of the path."""
    findings = facts["findings"]
    fails = [f for f in findings if f["severity"] == "fail"]
    return (fails or findings)[0]["at"] if findings else facts["shown"] // 2


def _picture(surface_class, shown, title, notes):
    facts, arrays = shown.facts, shown.arrays
    top = 26 if title else 0
    places, at = Places(facts, _ROWS, top, notes), shown_sample(facts)
    windows, left_out = windows_of(facts, places)
    bottom = places.bottom + height_of_windows(windows)
    surface = surface_class(_WIDTH, bottom, f"Path audit of {facts['name']}: {facts['verdict']}")
    if title:
        _draw_title(surface, facts)
    draw_rows(surface, places, facts, arrays)
    x = float(places.x(arrays["time_s"][at]))
    surface.line([(x, places.process - 5), (x, places.axis)], INK, 1, (1, 3))
    if windows:
        draw_windows(surface, facts, arrays, windows, left_out, places.bottom, _ROWS - 10)
    height = min(bottom - top - 12.0, 640.0)
    draw_arm(surface, (_ROWS + 10.0, top + 6.0, _WIDTH - _ROWS - 12.0, height), facts, arrays, at)
    return surface.finish()


def _draw_title(surface, facts):
    verdict = facts["verdict"]
    if verdict == "pass":
        surface.rect(8, 6, 14, 12, stroke=SEVERITY["pass"])
    else:
        surface.hatch(8, 6, 14, 12, verdict, SEVERITY[verdict])
        surface.rect(8, 6, 14, 12, stroke=SEVERITY[verdict], width=2 if verdict == "fail" else 1)
    surface.text(30, 12, verdict.upper(), INK, size=14, bold=True)
    about = f"{facts['file']}, {facts['samples']:,} samples, {facts['duration_s']:.2f} s, {facts['length_mm']:.0f} mm"
    surface.text(_WIDTH - 8, 12, about, SOFT, "right", size=12)
    surface.text(82, 12, shortened(surface, facts["name"], _WIDTH - 110 - surface.text_width(about, 12), 14), INK, size=14)
