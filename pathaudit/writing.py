"""Output files that appear whole or not at all."""

import os
import stat

from .errors import WriteError


def write_whole(file, content) -> None:
    """Write text (as UTF-8) or bytes to `file`, in place of what is there. Raises WriteError.

    The content goes to a new file beside it, which takes the name only when everything is on the disk: a full disk, a killed
    process or a lost power supply leave the old file or none. A device or a pipe is written directly.
    """
    data = content.encode("utf-8") if isinstance(content, str) else content
    try:
        target = os.path.realpath(file)
        mode = os.stat(target).st_mode if os.path.exists(target) else None
        if mode is None or stat.S_ISREG(mode):
            _replace(target, data, mode)
        else:
            with open(target, "wb") as stream:
                stream.write(data)
    except (OSError, ValueError) as error:
        raise WriteError(file, getattr(error, "strerror", None) or error) from None


def _replace(target, data, mode):
    folder = os.path.dirname(target)
    beside = os.path.join(folder, f".pathaudit-{os.urandom(6).hex()}")
    handle = os.open(beside, os.O_WRONLY | os.O_CREAT | os.O_EXCL | getattr(os, "O_BINARY", 0), 0o666)
    try:
        with open(handle, "wb") as stream:
            if mode is not None:
                os.chmod(beside, stat.S_IMODE(mode))
            stream.write(data)
            stream.flush()
            os.fsync(stream.fileno())
        os.replace(beside, target)
    except BaseException:
        os.unlink(beside)
        raise
    _sync_folder(folder)


def _sync_folder(folder):
    """Put the new name on the disk, where the system lets folders be opened."""
    try:
        handle = os.open(folder, os.O_RDONLY)
    except OSError:
        return
    try:
        os.fsync(handle)
    except OSError:
        pass  # the content is on the disk and the name is in place; some file systems cannot sync a folder
    finally:
        os.close(handle)
