"""The bytes and text of an input file, or a plain ReadError."""

import hashlib
import os
import stat

from ..errors import ReadError

LARGEST = 1 << 30
"""Bytes; an endless pipe must not fill the memory."""


def read_bytes(file, expected: str) -> tuple[bytes, str]:
    """The file's bytes and their SHA-256. `expected` says in messages what the file should be, e.g. 'a timed path (CSV)'."""
    try:
        with open(file, "rb") as stream:
            mode = os.fstat(stream.fileno()).st_mode
            if not (stat.S_ISREG(mode) or stat.S_ISFIFO(mode)):
                raise ReadError(file, "", "a device", expected)
            data = stream.read(LARGEST + 1)
    except FileNotFoundError:
        raise ReadError(file, "", "no such file", expected) from None
    except IsADirectoryError:
        raise ReadError(file, "", "a folder", expected) from None
    except OSError as error:
        raise ReadError(file, "", f"a file that cannot be read ({error.strerror})", expected) from None
    except ValueError:
        raise ReadError(file, "", "a name that no file can have", expected) from None
    if len(data) > LARGEST:
        raise ReadError(file, "", "more than 1 GiB", expected)
    if not data.strip():
        raise ReadError(file, "", "an empty file", expected)
    return data, hashlib.sha256(data).hexdigest()


def decode(file, data: bytes, expected: str) -> str:
    """UTF-8 text, without its byte-order mark and with '\\n' line ends."""
    if data.startswith((b"\xff\xfe", b"\xfe\xff")):
        raise ReadError(file, "", "UTF-16 text", f"{expected} saved as UTF-8")
    if b"\0" in data:
        raise ReadError(file, f"line {_line(data, data.index(0))}", "binary data", expected)
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise ReadError(file, f"line {_line(data, error.start)}", f"a byte {data[error.start]:#04x} that is not UTF-8", f"{expected} saved as UTF-8") from None
    return text.replace("\r\n", "\n").replace("\r", "\n")


def _line(data: bytes, position: int) -> int:
    before = data[:position].replace(b"\r\n", b"\n").replace(b"\r", b"\n")
    return before.count(b"\n") + 1
