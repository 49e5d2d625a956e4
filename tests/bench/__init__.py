"""Benchmarks: `python -m tests.bench` prints ratios measured in one run, each beside the bar it is meant to pass.

They are ratios, because a shared machine's clock wanders: both sides of each are measured in turn, pair by pair, and
the median pair counts. Nothing here passes or fails; `test_bench.py` only proves that both sides give the same numbers.
"""
