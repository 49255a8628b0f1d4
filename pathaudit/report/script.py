"""The timeline's ES modules as one string: what the widget and the one-page report both run."""

import base64
import hashlib
import re
import zlib
from functools import cache
from importlib.resources import files

# Each imports only from those before it.
MODULES = ("data", "dom", "theme", "axis", "layout", "strip", "rows", "overlay", "gestures", "choice", "keys", "span", "stretch", "space", "eye", "pen", "shading", "arm", "armpanel",
           "readout", "findings", "trial", "notes", "view", "kernel", "widget")

_IMPORT = re.compile(r"^import [^;]*;\n", re.MULTILINE)
_COMMENT = re.compile(r"^ *//.*\n", re.MULTILINE)
_EXPORT = re.compile(r"^export (?!default)", re.MULTILINE)


@cache
def joined_modules():
    """One ES module whose default export has `render`. The modules keep their names apart, so that joining is leaving out import and export,
    and the lines of comment with them."""
    texts = (_COMMENT.sub("", _EXPORT.sub("", _IMPORT.sub("", _read(f"{name}.js")))) for name in MODULES)
    return "\n".join(texts)


@cache
def shared_module():
    """A small module that loads the joined one once in a page, however many timelines are made there.

    A browser never lets an imported module go, so each run of a cell would otherwise keep a copy of it.
    """
    source = joined_modules().encode()
    packed = base64.b64encode(zlib.compress(source, 9)).decode()
    return _SHARED % {"name": f"pathaudit {hashlib.sha256(source).hexdigest()[:16]}", "packed": packed}


_SHARED = """const load = async () => {
  const packed = Uint8Array.from(atob("%(packed)s"), (c) => c.charCodeAt(0));
  const inflated = new Blob([packed]).stream().pipeThrough(new DecompressionStream("deflate"));
  const url = URL.createObjectURL(new Blob([await new Response(inflated).arrayBuffer()], { type: "text/javascript" }));
  try { return (await import(url)).default; } finally { URL.revokeObjectURL(url); }
};
const name = Symbol.for("%(name)s");
const shared = (globalThis[name] ??= load().catch((error) => { delete globalThis[name]; throw error; }));
export default { render: async (context) => (await shared).render(context) };
"""


@cache
def style_sheet():
    """The style sheet of the timeline."""
    return _read("style.css")


def _read(name):
    return (files("pathaudit") / "widgets" / name).read_text(encoding="utf-8")
