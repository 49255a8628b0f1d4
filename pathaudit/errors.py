"""Every exception that a user can cause.

Each message is one plain line, ready to print: where, what was found, what is expected.
The pieces stay readable as attributes.
"""

LONGEST_QUOTE = 160


def one_line(text) -> str:
    """`text` on one line and printable anywhere: breaks become spaces, unprintable characters their escapes."""
    joined = " ".join(str(text).split())
    return "".join(c if c.isprintable() else c.encode("unicode_escape").decode("ascii") for c in joined)


def quoted(text) -> str:
    """A piece of the user's own input as it is shown in a message: one line, cut where it is long."""
    line = one_line(text)
    return f"'{line}'" if len(line) <= LONGEST_QUOTE else f"'{line[:LONGEST_QUOTE]}…'"


def first_repeated(names):
    """The first name that stands a second time, or None."""
    seen = set()
    return next((name for name in names if name in seen or seen.add(name)), None)


class PathAuditError(Exception):
    """Something given to pathaudit cannot be used; `str(error)` is one plain line."""


class ReadError(PathAuditError):
    """A file cannot be used.

    file: as the user gave it.  where: line, column or key ('' for the file as a whole).
    found, expected: phrases that complete 'found ...' and 'expected ...'.
    """

    def __init__(self, file, where, found, expected):
        super().__init__(file, where, found, expected)
        self.file, self.where, self.found, self.expected = str(file), str(where), str(found), str(expected)

    def __str__(self):
        place = f"{self.file}: {self.where}" if self.where else self.file
        return one_line(f"{place}: found {self.found}, expected {self.expected}")


class ModelError(PathAuditError):
    """A value cannot be used.  `reason` completes 'expected ...': what is wanted, and why where that helps."""

    def __init__(self, field, value, reason):
        super().__init__(field, value, reason)
        self.field, self.value, self.reason = str(field), str(value), str(reason)

    def __str__(self):
        return one_line(f"{self.field}: found {self.value}, expected {self.reason}")


class WriteError(PathAuditError):
    """A file cannot be written."""

    def __init__(self, file, reason):
        super().__init__(file, reason)
        self.file, self.reason = str(file), str(reason)

    def __str__(self):
        return one_line(f"{self.file}: cannot be written: {self.reason}")


class UsageError(PathAuditError):
    """The command line cannot be understood."""

    def __str__(self):
        return one_line(super().__str__())
