"""The command line: `pathaudit check`, `pathaudit study`, `pathaudit sign`, `pathaudit convert`, `pathaudit notes` and `pathaudit demo`.

Exit status: 0 nothing fails; 1 a finding fails; 2 something given cannot be used, said in one line on stderr.
"""

import argparse
import os
import shlex
import sys

from . import __version__
from .conventions import LONG
from .errors import ModelError, PathAuditError, UsageError, WriteError, quoted

EXAMPLE = """example:
  pathaudit demo my-cell
  pathaudit check my-cell/seam.csv --cell my-cell/cell.toml --html seam.html --retimed slower.csv

exit status: 0 nothing fails, 1 at least one finding fails, 2 unusable input or arguments
"""


class _Parser(argparse.ArgumentParser):
    def error(self, message):
        raise UsageError(f"{message} (see {self.prog} --help)")


def main(arguments=None) -> int:
    """Run the command line; `arguments` default to those of the process. Returns the exit status."""
    try:
        return _run(arguments)
    except PathAuditError as error:
        _say(f"pathaudit: {error}\n", sys.stderr)
        return 2
    except KeyboardInterrupt:
        return 130


def _parser():
    parser = _Parser(
        prog="pathaudit", description="Check whether an arm can run a weld seam or a dispense bead as programmed.",
        epilog=EXAMPLE, formatter_class=argparse.RawDescriptionHelpFormatter, allow_abbrev=False,
    )  # fmt: skip
    parser.add_argument("--version", action="version", version=f"pathaudit {__version__}")
    commands = parser.add_subparsers(dest="command", metavar="COMMAND", required=True)
    check = _command(commands, "check", _check, "audit a path with a cell", "Audit a path with a cell (TOML). The path's content says what kind of file it is.", EXAMPLE)
    check.add_argument("path", metavar="PATH", help="the path: a timed CSV, or another of the formats below")
    check.add_argument("--cell", metavar="CELL.toml", required=True, help="the cell: arm, placement, tool, part, limits")
    check.add_argument("--json", metavar="FILE", help="write the verdict and findings as JSON; - writes them to stdout, the summary to stderr")
    check.add_argument("--joints", metavar="FILE.csv", help="write the joint motion and its measures, one row a sample")
    check.add_argument("--retimed", metavar="FILE.csv", help="write the path with the suggested times")
    check.add_argument("--html", metavar="FILE", help="write the whole audit as one self-contained page")
    check.add_argument("--notes", metavar="FILE.notes.toml", help="put these notes into the summary, the JSON and the page, with what is stale")
    check.add_argument("--against", metavar="EARLIER.json", help="tell what changed since this report of check --json, and whether its signature holds")
    _add_reading(check)
    _add_study(commands)
    _add_sign(commands)
    _add_convert(commands)
    _add_notes(commands)
    demo = _command(commands, "demo", _demo, "write a ready cell, path and notebook", "Write a ready cell, path and notebook into a folder.")
    demo.add_argument("folder", metavar="FOLDER", help="made where it is missing; nothing in it is overwritten")
    return parser


def _command(commands, name, run, help, description, epilog=None):
    """The parser of a command, whose options are given to `run`; it gives the exit status."""
    parser = commands.add_parser(name, help=help, description=description, epilog=epilog, formatter_class=argparse.RawDescriptionHelpFormatter, allow_abbrev=False)
    parser.set_defaults(run=run)
    return parser


STUDY = """example:
  pathaudit study my-cell/seam.csv --cell my-cell/cell.toml --draws 2000 --json spread.json

the cell states what may be off, for example:
  [tolerance]
  part_xyz_mm = 1.0                       # within +-1 mm along each axis of the world
  part_rpy_deg = [0.1, 0.1, 0.2]
  tool_xyz_mm = { sigma = 0.3 }           # or with a standard deviation
  joint_zero_deg = { j4 = 0.05 }
also: base_xyz_mm, base_rpy_deg, tool_rpy_deg, joint_zero_mm, link_mm, speed_percent

exit status: 0 no draw fails, 1 at least one draw or the cell as stated fails, 2 unusable input or arguments
"""


def _add_study(commands):
    what = "What the tolerances of a cell do to a path: chances, what to measure better first, how far off it may be."
    parser = _command(commands, "study", _study, "what the tolerances of a cell do to a path", what, STUDY)
    parser.add_argument("path", metavar="PATH", help="the path, in any of the formats that are read")
    parser.add_argument("--cell", metavar="CELL.toml", required=True, help="the cell, with what may be off under [tolerance]")
    parser.add_argument("--draws", metavar="N", default="2000", help="how many cells are drawn at random; 2000 where nothing is said")
    parser.add_argument("--seed", metavar="S", default="0", help="the same seed gives the same draws; 0 where nothing is said")
    parser.add_argument("--json", metavar="FILE", help="write all of it as JSON; - writes it to stdout, the summary to stderr")
    parser.add_argument("--html", metavar="FILE", help="write the audit with bands and tables of the study as one self-contained page")
    _add_reading(parser)


READING = {
    "format": ("format", "F", "what PATH is, where its content shall not decide: timed, waypoints, iso6983, cutter-location, parquet, feather, json-lines, recorded"),
    "axis": ("axis", "I,J,K", "the tool's +Z in the part frame, for a file without orientation; --axis=-1,0,0 where it begins with a minus"),
    "inch-codes": ("inch_codes", None, "G20 means inch and G21 millimetre"),
    "units": ("units", "U", "mm or inch, for a file that does not say it"),
    "speed": ("speed_mm_s", "MM/S", "the tool's largest speed, for a file without times"),
    "acceleration": ("acceleration_mm_s2", "MM/S2", "the tool's largest acceleration, for a file without times"),
    "turn-speed": ("turn_speed_deg_s", "DEG/S", "the tool's largest turning speed, for a file without times"),
    "turn-acceleration": ("turn_acceleration_deg_s2", "DEG/S2", "the tool's largest turning acceleration, for a file without times"),
    "corner": ("corner", "C", "corners: stop, or a radius such as 5mm, or a speed such as 50mm/s"),
    "chord": ("chord_mm", "MM", "how far a sampled curve may be from the exact one"),
    "angle": ("angle_deg", "DEG", "how far the tool may turn between two samples"),
    "step": ("step_s", "S", "the longest time between two samples"),
    "smooth": ("smooth_ms", "MS", "smooth a recorded path over so many milliseconds before and after each sample"),
}
"""Options that say how a path is read: the choice of the reader, what its value looks like, and what it does."""


def _add_reading(parser):
    group = parser.add_argument_group("how the path is read")
    for option, (name, value, words) in READING.items():
        if value is None:
            group.add_argument(f"--{option}", dest=name, action="store_true", help=words)
        else:
            group.add_argument(f"--{option}", dest=name, metavar=value, help=words)


def _read_path(file, options):
    """The path, read by the options on the command line, whose words stand in errors."""
    from .reading import read_path

    try:
        return read_path(file, **{name: getattr(options, name) for name, *_ in READING.values()})
    except ModelError as error:
        word = next((f"--{option}" for option, (name, *_) in READING.items() if name == error.field), error.field)
        raise UsageError(f"{word}: found {error.value}, expected {error.reason}") from None


SIGN = """examples:
  pathaudit check seam.csv --cell cell.toml --json seam.json
  pathaudit sign seam.json --by "A. Weber" --remark "run in slow manual mode on 3 March"
  pathaudit check seam.csv --cell cell.toml --against seam.json
"""


def _add_sign(commands):
    what = "Put a name and a date to a report of check --json. The signature becomes void when what it covers changes."
    parser = _command(commands, "sign", _sign, "put a name to a report", what, SIGN)
    parser.add_argument("report", metavar="REPORT.json", help="the report; it is written anew with the signature, in place of any it had")
    parser.add_argument("--by", metavar="NAME", required=True, help="the person who stands for it")
    parser.add_argument("--remark", metavar="TEXT", default="", help="what the person adds")


def _sign(options):
    from .earlier import read_earlier, signed
    from .report.noted import day
    from .report.tables import report_text
    from .writing import write_whole

    earlier = read_earlier(options.report)
    try:
        paper = signed(earlier, options.by, options.remark)
    except ValueError as error:
        raise UsageError(f"--by: {error}") from None
    write_whole(options.report, report_text(paper.values))
    notes = sum(not note.get("settled") for note in paper.values.get("notes", []) if isinstance(note, dict))
    said = f"{options.report}: signed by {paper.signature.by}, {day(paper.signature.on)}; verdict {paper.values['verdict']}, {len(paper.findings)} findings, {notes} open notes"
    _say(said + "\n", sys.stdout)
    return 0


CONVERT = """examples:
  pathaudit convert seam.csv seam.parquet
  pathaudit convert log.csv repaired.csv --format recorded
"""


def _add_convert(commands):
    parser = _command(commands, "convert", _convert, "write a path as another kind of file", "Write a path as timed CSV, JSON lines, Parquet or Feather.", CONVERT)
    parser.add_argument("path", metavar="IN", help="the path, in any of the formats that are read")
    parser.add_argument("out", metavar="OUT", help="the file to write; its ending says the format: .csv, .jsonl, .parquet, .feather")
    parser.add_argument("--to", metavar="F", choices=("timed", "json-lines", "parquet", "feather"), help="the format of OUT: timed, json-lines, parquet, feather")
    _add_reading(parser)


def _convert(options):
    from .converting import converted, kind_of
    from .reading.options import FORMATS
    from .writing import write_whole

    kind = kind_of(options.out, options.to)
    _check_outputs({"OUT": options.out}, [options.path])
    path = _read_path(options.path, options)
    content, lost = converted(path, kind)
    write_whole(options.out, content)
    said = [f"{options.out}: {path.samples:,} samples as {FORMATS[kind]}", *path.made]
    said.append("not kept: " + "; ".join(lost) if lost else "nothing was lost: the same columns, the same doubles")
    _say("\n".join(said) + "\n", sys.stdout)
    return 0


NOTES = """examples:
  pathaudit notes list seam.notes.toml seam.csv --cell cell.toml
  pathaudit notes merge mine.notes.toml theirs.notes.toml --out seam.notes.toml

exit status of merge: 0 merged, 1 merged and marked where somebody has to decide, 2 unusable input or arguments
"""


def _add_notes(commands):
    notes = _command(commands, "notes", None, "merge or list the notes pinned to a path", "Notes pinned to a path: merge them or list them.", NOTES)
    acts = notes.add_subparsers(dest="act", metavar="ACT", required=True)
    merging = _command(acts, "merge", _merge_notes, "make one file of two people's notes", "Make one file of two people's notes, without loss.", NOTES)
    merging.add_argument("ours", metavar="OURS", help="a file of notes")
    merging.add_argument("theirs", metavar="THEIRS", help="another one")
    merging.add_argument("--base", metavar="BASE", help="what both began with; it tells changes that were made by hand in an editor")
    merging.add_argument("--out", metavar="FILE", required=True, help="the merged notes: OURS, THEIRS or a new file")
    what = "Show notes; with path and cell, where they are now and what is stale."
    listing = _command(acts, "list", _list_notes, "show notes; with path and cell, what is stale", what, NOTES)
    listing.add_argument("file", metavar="FILE", help="a file of notes")
    listing.add_argument("path", metavar="PATH", nargs="?", help="the path that they are pinned to")
    listing.add_argument("--cell", metavar="CELL.toml", help="the cell; goes with PATH")
    _add_reading(listing)


def _run(arguments):
    try:
        options = _parser().parse_args(arguments)
    except SystemExit:  # argparse has printed what --help or --version asks for
        _say("", sys.stdout)
        return 0
    return options.run(options)


def _check(options):
    from .reading import read_cell

    path, cell, noted = _read_path(options.path, options), read_cell(options.cell), _read_notes(options.notes)
    outputs = {name: getattr(options, name) for name in ("json", "joints", "retimed", "html") if getattr(options, name) is not None}
    earlier = _read_earlier(options.against)
    asked = [file for file, there in ((options.notes, noted), (options.against, earlier)) if there]
    _check_outputs(outputs, [options.path, *(file for file, _ in cell.sources), *asked])

    from .pipeline import audit
    from .writing import write_whole
    from .report.text import summary

    if path.samples > LONG:
        _say(f"pathaudit: auditing {path.samples:,} samples ...\n", sys.stderr)
    judged = audit(path, cell)
    more = {"notes": _placed(noted, judged), "compared": _compared(earlier, judged)}
    for name, file in outputs.items():
        if file != "-":
            write_whole(file, _content(name, judged, more))
    piped = outputs.get("json") == "-"
    if piped:
        _say(_content("json", judged, more), sys.stdout)
    _say(summary(judged, **more), sys.stderr if piped else sys.stdout)
    return 1 if judged.verdict == "fail" else 0


def _study(options):
    from .reading import read_cell

    draws, seed = (_whole(f"--{name}", getattr(options, name)) for name in ("draws", "seed"))
    path, cell = _read_path(options.path, options), read_cell(options.cell)
    outputs = {name: getattr(options, name) for name in ("json", "html") if getattr(options, name) is not None}
    _check_outputs(outputs, [options.path, *(file for file, _ in cell.sources)])

    from .pipeline import audit
    from .report.page import one_page
    from .report.studied import study_text, study_values
    from .report.tables import report_text
    from .spread.study import study
    from .writing import write_whole

    judged = audit(path, cell)
    try:
        found = study(judged, draws, seed, told=_told())
    except ModelError as error:
        raise UsageError(f"--{error.field}: found {error.value}, expected {error.reason}") from None
    for name, file in outputs.items():
        if file != "-":
            write_whole(file, one_page(judged, study=found) if name == "html" else report_text(study_values(found)))
    piped = options.json == "-"
    if piped:
        _say(report_text(study_values(found)), sys.stdout)
    _say(study_text(found), sys.stderr if piped else sys.stdout)
    return 1 if judged.verdict == "fail" or found.verdict == "fail" or found.chance("fail").draws else 0


def _whole(word, text):
    """A whole number of an option."""
    try:
        return int(text)
    except ValueError:
        raise UsageError(f"{word}: found {quoted(text)}, expected a whole number") from None


def _told():
    """What says on a terminal, in one line, how far the work is; nothing elsewhere."""
    if sys.stderr is None or not sys.stderr.isatty():
        return None
    return lambda words, share: _say(f"\r\x1b[Kpathaudit: {words}" + ("\r\x1b[K" if share == 1.0 else ""), sys.stderr)


def _content(name, judged, more):
    from .report import tables

    if name == "html":
        from .report.page import one_page

        return one_page(judged, **more)
    if name == "retimed":
        return tables.retimed_csv(judged.suggestion)
    return tables.check_json(judged, **more) if name == "json" else tables.joints_csv(judged)


def _read_notes(file):
    if file is None:
        return None
    from .notes import read_notes

    return read_notes(file)


def _read_earlier(file):
    if file is None:
        return None
    from .earlier import read_earlier

    return read_earlier(file)


def _compared(earlier, judged):
    if earlier is None:
        return None
    from .against import against

    return against(earlier, judged)


def _placed(notes, judged):
    if notes is None:
        return ()
    from .notes import placed

    return placed(notes, judged)


def _merge_notes(options):
    from .notes import merge, notes_text
    from .writing import write_whole

    sources = [options.ours, options.theirs]
    ours, theirs = map(_read_notes, sources)
    base = None if options.base is None or _is_empty(options.base) else _read_notes(options.base)
    if not options.out.strip("-"):
        raise UsageError(f"--out: found {quoted(options.out)}, expected a file name")
    if os.path.lexists(options.out) and not any(os.path.realpath(options.out) == os.path.realpath(file) for file in sources):
        raise UsageError(f"--out {options.out}: found a file that is neither OURS nor THEIRS, expected one of them or a new name")
    merged = merge(ours, theirs, base)
    write_whole(options.out, notes_text(merged))
    _say(f"{options.out}: " + _merged_words(merged), sys.stdout)
    return 1 if any(note.marked for note in merged.items) else 0


def _is_empty(file):
    """Version control gives an empty file where two people have added the same file."""
    return os.path.isfile(file) and os.path.getsize(file) == 0


def _merged_words(merged):
    from .report.noted import to_decide, visible

    marked = [f"  {note.id} at {note.at_mm:.1f} mm: {visible(to_decide(note))}\n" for note in merged.items if note.marked]
    removed = len(merged.items) - len(merged.kept)
    return f"{len(merged.kept)} note{'' if len(merged.kept) == 1 else 's'}, {removed} deleted, {len(marked) or 'nothing'} to decide\n{''.join(marked)}"


def _list_notes(options):
    from .report.text import notes_text

    if (options.path is None) != (options.cell is None):
        raise UsageError("notes list: found " + ("PATH without --cell" if options.cell is None else "--cell without PATH") + ", expected both or neither")
    notes = _read_notes(options.file)
    if options.path is None:
        from .notes import Placed

        shown = notes_text([Placed(note, 0, 0.0, note.at_mm, "") for note in notes.kept])
    else:
        from .pipeline import audit
        from .reading import read_cell

        judged = audit(_read_path(options.path, options), read_cell(options.cell))
        shown = notes_text(_placed(notes, judged), judged)
    _say((shown or "No notes.") + "\n", sys.stdout)
    return 0


def _check_outputs(outputs, inputs):
    """Refuse before the work what could not be written after it, and what would destroy an input."""
    taken = {os.path.realpath(file): f"the input {file}" for file in inputs}
    for name, file in outputs.items():
        if file == "-" and name == "json":
            continue
        if file in ("", "-"):
            raise UsageError(f"{_word(name)}: found {quoted(file)}, expected a file name")
        place = os.path.realpath(file)
        if place in taken:
            raise UsageError(f"{_word(name)} {file}: found the same file as {taken[place]}, expected a file of its own")
        if os.path.isdir(place):
            raise WriteError(file, "it is a folder")
        if not os.path.isdir(os.path.dirname(place)):
            raise WriteError(file, f"there is no folder {os.path.dirname(file)}")
        if os.path.isfile(place) or not os.path.exists(place):  # devices and pipes may take several outputs
            taken[place] = _word(name)


def _word(name):
    """How an output is called on the command line."""
    return name if name.isupper() else f"--{name}"


def _say(text, stream):
    """Print to a stream that may be closed, full, or unable to show every character; a reader that has gone is no error."""
    if stream is None:
        return
    encoding = getattr(stream, "encoding", None) or "utf-8"
    try:
        stream.write(text.encode(encoding, "replace").decode(encoding))
        stream.flush()
    except OSError as error:
        _silence(stream)
        if stream is not sys.stderr and not isinstance(error, BrokenPipeError):
            raise WriteError("standard output", error.strerror or error) from None


def _silence(stream):
    """Send what the stream still holds to nowhere, so that the interpreter's last flush says nothing."""
    try:
        os.dup2(os.open(os.devnull, os.O_WRONLY), stream.fileno())
    except (OSError, ValueError):
        pass


def _demo(options):
    from importlib.resources import files

    from .writing import write_whole

    folder = options.folder
    items = sorted((files("pathaudit") / "demo").iterdir(), key=lambda item: item.name)
    contents = {os.path.join(folder, item.name): item.read_bytes() for item in items if item.is_file() and item.name[0] not in "._"}
    for file in contents:
        if os.path.lexists(file):
            raise WriteError(file, "it exists already, and nothing is overwritten")
    try:
        os.makedirs(folder, exist_ok=True)
    except OSError as error:
        raise WriteError(folder, error.strerror or error) from None
    for file, content in contents.items():
        write_whole(file, content)
    path, cell = (shlex.quote(os.path.join(folder, name)) for name in ("seam.csv", "cell.toml"))
    _say("".join(f"{file}\n" for file in contents) + f"\nNow: pathaudit check {path} --cell {cell}\n", sys.stdout)
    return 0
