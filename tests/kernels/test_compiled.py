"""The cache of compiled kernels: named after its sources, announced once, and never stale."""

import os
import shutil
import subprocess
import sys
from pathlib import Path

import pathaudit.kernels
from pathaudit.kernels import compiled

SOURCES = Path(pathaudit.kernels.__file__).parent


def test_every_kernel_source_names_the_folder(tmp_path):
    """A copy of the package with one byte more in one helper file gets a folder of its own, and drops the old one."""
    root = tmp_path / "pathaudit"
    shutil.copytree(SOURCES.parent, root, ignore=shutil.ignore_patterns("__pycache__", "demo", "widgets", "report"))
    ask = "from pathaudit.kernels.compiled import cache_folder; print(cache_folder())"
    env = {**os.environ, "PYTHONPATH": str(tmp_path)}

    def folder():
        return Path(subprocess.run([sys.executable, "-c", ask], cwd=tmp_path, env=env, capture_output=True, text=True, check=True).stdout.strip())

    first = folder()
    assert first == folder() and first.is_dir() and root in first.parents
    (root / "kernels" / "task.py").write_text((root / "kernels" / "task.py").read_text() + "# more\n")
    second = folder()
    assert second != first and second.is_dir() and not first.exists()


def test_a_prepared_installation_says_nothing():
    run = subprocess.run([sys.executable, "-c", "import pathaudit.kernels.rates, pathaudit.kernels.clocks"], capture_output=True, text=True, check=True)
    assert run.stderr == "" and run.stdout == ""
    assert {path.suffix for path in compiled.cache_folder().iterdir()} >= {".done"}
