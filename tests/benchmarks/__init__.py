"""Benchmarks: `python -m tests.benchmarks` prints one table, each ratio from one run on one machine.  Never part of the tests."""
