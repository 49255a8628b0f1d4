"""TOML text as plain values, or a plain ReadError."""

import re
import tomllib

from ..errors import ReadError, quoted


def parse_toml(file, text, expected) -> dict:
    """The values in `text`, the text of `file`. `expected` says in messages what the file should be."""
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        place = re.search(r"\(at (.*)\)$", str(error))
        reason = re.sub(r" \(at .*\)$", "", str(error))
        raise ReadError(file, place[1] if place else "", f"text that is not TOML ({reason})", expected) from None
    except (ValueError, RecursionError) as error:
        raise ReadError(file, "", f"text that is not TOML ({type(error).__name__})", expected) from None


def shown(value) -> str:
    """A TOML value as it is named in messages."""
    if isinstance(value, dict):
        return "a table"
    if isinstance(value, list):
        return f"a list of {len(value)}"
    if isinstance(value, bool):
        return str(value).lower()
    return quoted(value) if isinstance(value, str) else quoted(value)[1:-1]
