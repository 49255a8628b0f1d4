"""The command line: `pathaudit check` and `pathaudit demo`.

Exit status: 0 nothing fails; 1 a finding fails; 2 something given cannot be used, said in one line on stderr.
"""

import argparse
import os
import shlex
import sys

from . import __version__
from .errors import PathAuditError, UsageError, WriteError, quoted

EXAMPLE = """example:
  pathaudit demo my-cell
  pathaudit check my-cell/seam.csv --cell my-cell/cell.toml --html seam.html --retimed slower.csv

exit status: 0 nothing fails, 1 at least one finding fails, 2 unusable input or arguments
"""

LONG = 50_000  # samples from which the work may take longer than a second, so that a line says what goes on


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
    check = commands.add_parser(
        "check", help="audit a timed path with a cell", description="Audit a timed path (CSV) with a cell (TOML).",
        epilog=EXAMPLE, formatter_class=argparse.RawDescriptionHelpFormatter, allow_abbrev=False,
    )  # fmt: skip
    check.add_argument("path", metavar="PATH", help="the timed path, a CSV file")
    check.add_argument("--cell", metavar="CELL.toml", required=True, help="the cell: arm, placement, tool, part, limits")
    check.add_argument("--json", metavar="FILE", help="write the verdict and findings as JSON; - writes them to stdout, the summary to stderr")
    check.add_argument("--joints", metavar="FILE.csv", help="write the joint motion and its measures, one row a sample")
    check.add_argument("--retimed", metavar="FILE.csv", help="write the path with the suggested times")
    check.add_argument("--html", metavar="FILE", help="write the whole audit as one self-contained page")
    demo = commands.add_parser("demo", help="write a ready cell, path and notebook", description="Write a ready cell, path and notebook into a folder.", allow_abbrev=False)
    demo.add_argument("folder", metavar="FOLDER", help="made where it is missing; nothing in it is overwritten")
    return parser


def _run(arguments):
    try:
        options = _parser().parse_args(arguments)
    except SystemExit:  # argparse has printed what --help or --version asks for
        _say("", sys.stdout)
        return 0
    return _check(options) if options.command == "check" else _demo(options.folder)


def _check(options):
    from .reading import read_cell, read_path

    path, cell = read_path(options.path), read_cell(options.cell)
    outputs = {name: getattr(options, name) for name in ("json", "joints", "retimed", "html") if getattr(options, name) is not None}
    _check_outputs(outputs, [options.path, *(file for file, _ in cell.sources)])

    from .pipeline import audit
    from .writing import write_whole
    from .report.text import summary

    if path.samples > LONG:
        _say(f"pathaudit: auditing {path.samples:,} samples ...\n", sys.stderr)
    judged = audit(path, cell)
    for name, file in outputs.items():
        if file != "-":
            write_whole(file, _content(name, judged))
    piped = outputs.get("json") == "-"
    if piped:
        _say(_content("json", judged), sys.stdout)
    _say(summary(judged), sys.stderr if piped else sys.stdout)
    return 1 if judged.verdict == "fail" else 0


def _content(name, judged):
    from .report import tables

    if name == "html":
        from .report.page import one_page

        return one_page(judged)
    if name == "retimed":
        return tables.retimed_csv(judged.suggestion)
    return tables.check_json(judged) if name == "json" else tables.joints_csv(judged)


def _check_outputs(outputs, inputs):
    """Refuse before the work what could not be written after it, and what would destroy an input."""
    taken = {os.path.realpath(file): f"the input {file}" for file in inputs}
    for name, file in outputs.items():
        if file == "-" and name == "json":
            continue
        if file in ("", "-"):
            raise UsageError(f"--{name}: found {quoted(file)}, expected a file name")
        place = os.path.realpath(file)
        if place in taken:
            raise UsageError(f"--{name} {file}: found the same file as {taken[place]}, expected a file of its own")
        if os.path.isdir(place):
            raise WriteError(file, "it is a folder")
        if not os.path.isdir(os.path.dirname(place)):
            raise WriteError(file, f"there is no folder {os.path.dirname(file)}")
        if os.path.isfile(place) or not os.path.exists(place):  # devices and pipes may take several outputs
            taken[place] = f"--{name}"


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


def _demo(folder):
    from importlib.resources import files

    from .writing import write_whole

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
