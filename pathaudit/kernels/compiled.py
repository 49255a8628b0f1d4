"""How a kernel becomes machine code, once per installation.

Numba keeps compiled code on disk, keyed by the file of the entry point alone: an edited helper in another file would leave a stale
entry point behind. The cache folder here is therefore named after all kernel sources and the versions of Numba and NumPy.
"""

import hashlib
import os
import shutil
import subprocess
import sys
from functools import lru_cache
from pathlib import Path

import numba
import numpy as np
from numba.core import config

OPTIONS = {"error_model": "numpy", "nogil": True, "fastmath": {"contract"}}

helper = numba.njit(_nrt=False, no_cpython_wrapper=True, no_cfunc_wrapper=True, **OPTIONS)
"""Decorator of a function that only kernels call and that makes no array: without reference counts, which cost as much as the work, and
without the door from Python, which takes a tenth of the time to compile."""


def dense(values, dtype=np.float64):
    """`values` as a kernel takes them: C order, and writable, which read-only arrays are not to a compiled signature."""
    return np.require(values, dtype, ["C", "W"])


def kernel(signature):
    """Decorator of an entry point: compiled for `signature` when its module is imported, or loaded from the cache folder."""

    def decorate(function):
        folder = cache_folder()
        done = folder / f"{function.__name__}.done"
        fresh = not done.exists()
        if fresh:
            _announce()
        before = config.CACHE_DIR
        config.CACHE_DIR = str(folder)
        try:
            dispatcher = numba.njit(signature, cache=True, **OPTIONS)(function)
        finally:
            config.CACHE_DIR = before
        if fresh:
            done.touch()
        return dispatcher

    return decorate


@lru_cache(maxsize=1)
def cache_folder():
    """The folder of compiled kernels: beside the sources where that can be written, else in the user's own cache folder."""
    here = Path(__file__).parent
    stamp = hashlib.sha256(f"{numba.__version__} {np.__version__} {sys.version_info[:2]}".encode())
    for source in sorted(here.glob("*.py")):
        stamp.update(source.read_bytes())
    root = here / "__pycache__"
    if not _writable(root):
        from platformdirs import user_cache_path

        root = user_cache_path("pathaudit")
    folder = root / f"kernels-{stamp.hexdigest()[:16]}"
    folder.mkdir(parents=True, exist_ok=True)
    for old in root.glob("kernels-*"):
        if old != folder:
            shutil.rmtree(old, ignore_errors=True)
    return folder


def _writable(folder):
    try:
        folder.mkdir(exist_ok=True)
    except OSError:
        return False
    return os.access(folder, os.W_OK)


@lru_cache(maxsize=1)
def _announce():
    """Tell that the first run takes a while, and let a second process prepare the other half of the kernels at the same time."""
    if "PATHAUDIT_PREPARING" in os.environ:
        return
    sys.stderr.write("pathaudit: preparing its numerical kernels, once per installation (10 to 20 s) ...\n")
    sys.stderr.flush()
    try:
        subprocess.Popen(
            [sys.executable, "-c", "import pathaudit.kernels.rates, pathaudit.kernels.clocks"],
            env={**os.environ, "PATHAUDIT_PREPARING": "1", "PYTHONPATH": os.pathsep.join(p for p in sys.path if p)},
            stdin=subprocess.DEVNULL, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL,
        )  # fmt: skip
    except OSError:
        pass  # then this process prepares them all, one after the other
