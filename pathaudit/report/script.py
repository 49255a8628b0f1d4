"""The timeline's ES modules as one string: what the widget and the one-page report both run."""

import re
from functools import cache
from importlib.resources import files

MODULES = ("data", "theme", "rows", "arm", "view", "widget")      # each imports only from those before it

_IMPORT = re.compile(r"^import [^;]*;\n", re.MULTILINE)
_EXPORT = re.compile(r"^export (?!default)", re.MULTILINE)


@cache
def joined_modules():
    """One ES module whose default export has `render`. The modules keep their names apart, so that joining is leaving out import and export."""
    texts = (_EXPORT.sub("", _IMPORT.sub("", _read(f"{name}.js"))) for name in MODULES)
    return "\n".join(texts)


@cache
def style_sheet():
    """The style sheet of the timeline."""
    return _read("style.css")


def _read(name):
    return (files("pathaudit") / "widgets" / name).read_text(encoding="utf-8")
