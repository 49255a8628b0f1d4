"""Makes what people have written into the demo: the notes of two of them on one seam, each with a copy of the same file, and a signed report.

`python tests/make_notes.py` writes them to the demo and to notebooks/. Names, dates and ids are fixed, so that the files come out the same each time.
"""

import contextlib
import json
from dataclasses import replace
from datetime import UTC, datetime

from make_demo import DEMO, NOTEBOOKS

import pathaudit as pa
from pathaudit.earlier import earlier_from, signed
from pathaudit.notes import Notes, new_note, write_notes
from pathaudit.report.tables import check_json, report_text

DAY, NIGHT = "handover.notes.toml", "handover-night.notes.toml"
SIGNED = "seam-signed.json"
LIND, SATO = "R. Lind", "M. Sato"


def audits():
    """The seam as it is, and as it was when the first note was written: 26 mm/s."""
    path, cell = pa.read_path(DEMO / "seam.csv"), pa.read_cell(DEMO / "cell.toml")
    faster = replace(path, time=path.time[0] + (path.time - path.time[0]) * 24.0 / 26.0)
    return pa.audit(path, cell), pa.audit(faster, cell)


def labelled(audit, label, share):
    """A sample inside the stretch with that label."""
    inside = [k for k, word in enumerate(audit.path.label) if word == label]
    return inside[int(share * (len(inside) - 1))]


def day_notes():
    now, before = audits()
    speed = next(k for k, f in enumerate(now.finding_list) if f.kind == "joint speed" and f.severity == "fail")
    made = [
        ("4c1d70a2", new_note(before, labelled(before, "second leg", 0.4), "26 mm/s was asked for here.\nTwo macro sections at this place passed.", LIND, date="2026-02-11T08:15:00Z")),
        ("8be05f13", new_note(now, labelled(now, "first leg", 0.02), "Arc start: torch waits 0.4 s, agreed.", LIND, date="2026-03-02T06:40:00Z").settle(True, SATO, "2026-03-02T21:05:00Z")),
        ("d2976e40", new_note(now, None, "Fails on this bench. Ask for the fixture 60 mm lower before anyone slows the corner.", LIND, finding=speed, date="2026-03-02T06:52:00Z")),
    ]
    return Notes(tuple(replace(note, id=name) for name, note in made))


def night_notes(day):
    """The same file after the night shift: one text changed, one note more."""
    now, _ = audits()
    asked = day.by_id["d2976e40"].edit("Fails on this bench. Fixture drawing allows 60 mm lower; see cell-moved.toml.", SATO, "2026-03-03T01:20:00Z")
    cable = new_note(now, labelled(now, "corner", 0.9), "Hose package close to the bent wall here: look at it in slow manual mode.", SATO, date="2026-03-03T01:31:00Z")
    return day.put(asked).put(replace(cable, id="5a30c9e8"))


def day_notes_later(day):
    """What the day shift wrote meanwhile into its own copy."""
    return day.put(day.by_id["d2976e40"].edit("Fails on this bench. Fixture lowered by 60 mm on Tuesday: audit again.", LIND, "2026-03-03T06:35:00Z"))


def signed_report():
    """The report of the moved fixture, as it was signed."""
    with contextlib.chdir(DEMO):
        audit = pa.audit(pa.read_path("seam.csv"), pa.read_cell("cell-moved.toml"))
    when = datetime(2026, 3, 4, 7, 10, tzinfo=UTC)
    return report_text(signed(earlier_from(json.loads(check_json(audit))), LIND, "Fixture lowered; first run in manual reduced-speed mode.", when).values)


def main():
    day = day_notes()
    for folder in (DEMO, NOTEBOOKS):
        for name, notes in ((DAY, day_notes_later(day)), (NIGHT, night_notes(day))):
            (folder / name).unlink(missing_ok=True)
            write_notes(folder / name, notes)
        (folder / SIGNED).write_text(signed_report(), encoding="utf-8")


if __name__ == "__main__":
    main()
