"""A JSON file as plain values."""

import json

from ..errors import ReadError
from .sources import read_bytes


def read_json(file, expected):
    """The values of a JSON file; expected: in words what it should hold. Raises ReadError."""
    data, _ = read_bytes(file, expected)
    try:
        return json.loads(data.decode("utf-8-sig"))
    except json.JSONDecodeError as error:
        raise ReadError(file, f"line {error.lineno}", f"no JSON ({error.msg})", expected) from None
    except (ValueError, RecursionError):
        raise ReadError(file, "", "no JSON text in UTF-8", expected) from None
