"""Whatever the bytes are, a reader reads them or refuses them in one line, soon and with bounded memory: a short run, and all cases found before.

`python -m tests.fuzzing all 120` is the long one.
"""

import random
import sys
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

ROOT = Path(__file__).parents[2]
if str(ROOT) not in sys.path:
    sys.path.insert(0, str(ROOT))

from tests.fuzzing import readers  # noqa: E402
from tests.fuzzing.mutating import WORDS, mutated  # noqa: E402

pytestmark = pytest.mark.filterwarnings("error")
pytest.importorskip("pyarrow")

FOUND = [(reader, file) for reader in readers.READERS for file in readers.corpus(reader)]


@pytest.mark.parametrize("reader", sorted(set(readers.READERS) - {"door"}))
def test_the_good_files_are_good(reader):
    for data in readers.good_files(reader):
        readers.READERS[reader](data)


@pytest.mark.parametrize("reader, file", FOUND, ids=[f"{reader}-{file.name}" for reader, file in FOUND])
def test_what_was_found_before(reader, file):
    readers.one(reader, file.read_bytes())


@pytest.mark.parametrize("reader", readers.READERS)
def test_mutated_files(reader):
    rng, good = random.Random(20), list(readers.good_files(reader))
    for _ in range(150):
        readers.one(reader, mutated(rng.choice(good), rng, good))


@pytest.mark.parametrize("reader", readers.READERS)
@settings(max_examples=25, deadline=None)
@given(st.lists(st.sampled_from(WORDS) | st.binary(max_size=12), max_size=30))
def test_rubbish(reader, pieces):
    readers.one(reader, b"".join(pieces))


@pytest.mark.parametrize("reader", readers.READERS)
def test_inputs_that_could_blow_up(reader):
    """Deep nesting, endless numbers, endless lines, many columns, many rows of nothing."""
    for data in (b"[" * 100_000, b"{" * 50_000, b"9" * 100_000, b"-" * 50_000, b"," * 90_000, b"a," * 45_000, b"\n" * 100_000, b'"' * 99_999, b"t_s\n" * 25_000, b"(" * 50_000,
                 b"G1" * 20_000, b"X1" * 20_000, b"GOTO/" + b"1," * 30_000, b"a=[" + b"1," * 30_000 + b"]", b"<robot>" + b"<link>" * 20_000, b'{"t_s":' * 9_000, b"PAR1" * 9_000, b"1e" + b"9" * 50_000):  # fmt: skip
        assert readers.one(reader, data) < 5 * readers.SLOWEST
