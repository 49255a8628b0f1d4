"""Files as they come out of a bad transfer or a careless edit, and how a reader answers them."""

import numpy as np
import pytest

import pathaudit as pa


def damaged(text, rng, letters, pieces):
    """The bytes of `text` with one to three places changed: a letter replaced, up to 15 bytes cut out, or a piece put in."""
    data = bytearray(text.encode())
    for _ in range(rng.randint(1, 3)):
        at = rng.randrange(len(data))
        match rng.randrange(3):
            case 0:
                data[at] = rng.choice(letters)
            case 1:
                del data[at : at + rng.randint(1, 15)]
            case 2:
                data[at:at] = rng.choice(pieces)
    return bytes(data)


def assert_refused(read, text, file, words):
    """The text is refused by one line that begins with `words` after the file's name, and says what is expected."""
    with pytest.raises(pa.ReadError) as caught:
        read(text)
    message = str(caught.value).removeprefix(f"{file}: ")
    assert message.startswith(words) and "\n" not in message and ", expected " in message, message


def assert_timed_or_refused(path_of, text, rng, letters, pieces, times=1500):
    """Each damaged form of the text is either refused in one line, or path_of(bytes) is a path whose numbers and times can be used."""
    for _ in range(times):
        try:
            path = path_of(damaged(text, rng, letters, pieces))
        except pa.PathAuditError as error:
            assert len(str(error).splitlines()) == 1, str(error)
        else:
            assert np.isfinite(path.position).all() and (np.diff(path.time) > 0).all()
