"""The bytes and text of an input file, or a plain ReadError."""

import hashlib
import os
import stat

from ..errors import ReadError

LARGEST = 1 << 30
"""Bytes; an endless pipe must not fill the memory."""

LARGE = 4 << 20
"""Bytes; from here on a file is worth threads and an engine."""


def read_bytes(file, expected: str) -> tuple[bytes, str]:
    """The file's bytes and their SHA-256. `expected` says in messages what the file should be, e.g. 'a timed path (CSV)'."""
    data = read_all(file, expected)[:]
    return data, hash_of(data)


def read_all(file, expected: str):
    """The file's bytes; of a large file a `LargeFile`, which reads its slices when they are asked for."""
    try:
        with open(file, "rb") as stream:
            status = os.fstat(stream.fileno())
            regular = stat.S_ISREG(status.st_mode)
            if not (regular or stat.S_ISFIFO(status.st_mode)):
                raise ReadError(file, "", "a device", expected)
            large = regular and hasattr(os, "pread") and LARGE <= status.st_size <= LARGEST
            data = LargeFile(file, os.dup(stream.fileno())) if large else stream.read(LARGEST + 1)
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
    if not data[:4096].strip() and not data[:].strip():
        raise ReadError(file, "", "an empty file", expected)
    return data


class LargeFile:
    """The bytes of a file that are read slice by slice. It stays open: a file that takes its name does not change it."""

    def __init__(self, file, handle):
        self.file, self.handle = file, handle
        self.state = self._state()
        self.size = self.state[0]

    def _state(self):
        status = os.fstat(self.handle)
        return status.st_size, status.st_mtime_ns

    def __len__(self):
        return self.size

    def __getitem__(self, where):
        """Bytes; raises ReadError where somebody has written into the file since it was opened."""
        start, stop, _ = where.indices(self.size)
        parts = []
        while start < stop:
            try:
                parts.append(os.pread(self.handle, min(stop - start, 1 << 30), start))
            except OSError as error:
                raise ReadError(self.file, "", f"a file that cannot be read ({error.strerror})", "a file that stays as it is while it is used") from None
            if not parts[-1]:
                break
            start += len(parts[-1])
        if start < stop or self._state() != self.state:
            raise ReadError(self.file, "", "a file that has changed since it was opened", "a file that stays as it is while it is used")
        return b"".join(parts)

    def __del__(self):
        os.close(self.handle)


def hash_of(data, piece=1 << 22) -> str:
    """The SHA-256 of the bytes."""
    digest = hashlib.sha256()
    for start in range(0, len(data), piece):
        digest.update(data[start : start + piece])
    return digest.hexdigest()


def decode(file, data: bytes, expected: str) -> str:
    """UTF-8 text, without its byte-order mark and with '\\n' line ends."""
    check_text(file, data, expected)
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise not_utf8(file, line_of(data, error.start), data[error.start], expected) from None
    return text.replace("\r\n", "\n").replace("\r", "\n")


def check_text(file, data: bytes, expected: str) -> None:
    """Refuse what is no text of one byte a letter."""
    if data.startswith((b"\xff\xfe", b"\xfe\xff")) or _every_second_is_zero(data[:400]):
        raise ReadError(file, "", "UTF-16 text", f"{expected} saved as UTF-8")
    if b"\0" in data:
        raise ReadError(file, f"line {line_of(data, data.index(0))}", "binary data", expected)


def _every_second_is_zero(start):
    """UTF-16 without its mark: Latin letters have a zero as every first or every second byte."""
    return len(start) >= 8 and any(not any(half) for half in (start[::2], start[1::2])) and any(start)


def not_utf8(file, line, byte, expected):
    return ReadError(file, f"line {line}", f"a byte {byte:#04x} that is not UTF-8", f"{expected} saved as UTF-8")


def line_of(data: bytes, position: int) -> int:
    """The number of the line in which a byte stands."""
    before = data[:position].replace(b"\r\n", b"\n").replace(b"\r", b"\n")
    return before.count(b"\n") + 1
