"""The benchmark runs, and measures what it says: a small size only."""

import bench_assign


def test_benchmark_measures_every_kind_of_work():
    found = bench_assign.measure(300)
    assert list(found) == ["a read csv", "b bare", "c fields", "d fields, margins", "e assign"]
    assert all(value > 0 for value in found.values())
