"""Output files that appear whole or not at all."""

import hashlib
import os
import re
import socket
import stat

from .errors import WriteError


def write_whole(file, content) -> None:
    """Write text (as UTF-8) or bytes to `file`, in place of what is there. Raises WriteError.

    The content goes to a new file beside it, which takes the name only when everything is on the disk: a full disk, a killed
    process or a lost power supply leave the old file or none. A device or a pipe is written directly. What a killed process has left
    beside an output goes with the next one that is written into that folder by the same run of the same system.
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
    system = _system()
    _sweep(folder, system)
    owner = f"{system}-{os.getpid()}-" if system else ""
    beside = os.path.join(folder, f".pathaudit-{owner}{os.urandom(6).hex()}")
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


_UNFINISHED = re.compile(r"\.pathaudit-([0-9a-f]{16})-([1-9][0-9]*)-[0-9a-f]{12}")


def _system():
    """Sixteen digits for the place in which a process number means one process: the run of the kernel, the host, the space of process numbers.

    '' where that cannot be told (only Linux tells it). A container has its own; so have other hosts that see the same shared folder.
    """
    try:
        with open("/proc/sys/kernel/random/boot_id", encoding="ascii") as stream:
            boot = stream.read().strip()
        place = f"{boot} {socket.gethostname()} {os.stat('/proc/self/ns/pid').st_ino}"
    except (OSError, ValueError):
        return ""
    return hashlib.sha256(place.encode()).hexdigest()[:16] if len(boot) == 36 else ""


def _sweep(folder, system):
    """Remove the unfinished files of processes that are certainly gone: those of this system whose number no process has.

    Any other stays: a living process may have it, here or on another host. Nobody takes a dead process's file up again, so no lock is needed.
    """
    if not system:
        return
    try:
        with os.scandir(folder) as entries:
            found = [(entry.path, _UNFINISHED.fullmatch(entry.name)) for entry in entries if entry.name.startswith(".pathaudit-") and entry.is_file(follow_symlinks=False)]
    except OSError:
        return  # a folder that may be written but not listed
    for path, made_by in found:
        if made_by and made_by[1] == system and _is_gone(int(made_by[2])):
            try:
                os.unlink(path)
            except OSError:
                pass  # somebody else's folder, or somebody else has swept it


def _is_gone(process):
    try:
        os.kill(process, 0)  # sends nothing; another user's process says that it may not
    except ProcessLookupError:
        return True
    except (OSError, OverflowError):
        return False
    return False


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
