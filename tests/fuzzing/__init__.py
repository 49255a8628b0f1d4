"""Readers under mutated files: `python -m tests.fuzzing READER SECONDS`, run by hand; tests/reading/test_fuzzed.py does a little of the same in every run."""
