"""Parquet in batches: the same as the whole table at once, and nothing half-written."""

import numpy as np
import pandas as pd
import pytest

from gley import assign, assign_file, bulk
from gley.errors import GleyError, UsageError


@pytest.fixture
def samples():
    rng = np.random.default_rng(5)
    count = 40
    return pd.DataFrame(
        {
            "sample": [f"s{i}" for i in range(count)],
            "pH": rng.uniform(5, 9, count),
            "Eh_mV": rng.uniform(-300, 600, count),
            "temperature_C": 12.0,
            "SC_uS_cm": 500.0,
            "Fe_mol_L": 10 ** rng.uniform(-7, -4, count),
            "alkalinity_eq_L": 3e-3,
            "SO4_mol_L": 1e-3,
        }
    )


def test_batches_equal_the_whole(samples, tmp_path, monkeypatch):
    monkeypatch.setattr(bulk, "BATCH", 7)
    samples.to_parquet(tmp_path / "in.parquet")
    assert assign_file(tmp_path / "in.parquet", tmp_path / "out.parquet", ["Fe", "Mn"]) == 80
    got = pd.read_parquet(tmp_path / "out.parquet")
    whole = assign(samples, ["Fe", "Mn"])
    pd.testing.assert_frame_equal(got, whole.astype(got.dtypes), rtol=1e-12)  # to the last bits of a matrix product
    assert sorted(path.name for path in tmp_path.iterdir()) == ["in.parquet", "out.parquet"]


def test_existing_target_is_refused_and_stays(samples, tmp_path):
    samples.to_parquet(tmp_path / "in.parquet")
    (tmp_path / "out.parquet").write_bytes(b"old")
    with pytest.raises(GleyError, match=r"out\.parquet is there already"):
        assign_file(tmp_path / "in.parquet", tmp_path / "out.parquet", ["Fe"])
    assert (tmp_path / "out.parquet").read_bytes() == b"old"


def test_bad_calls_leave_nothing(samples, tmp_path):
    samples.to_parquet(tmp_path / "in.parquet")
    (tmp_path / "text.parquet").write_text("no parquet")
    with pytest.raises(GleyError, match="can't be read as Parquet"):
        assign_file(tmp_path / "text.parquet", tmp_path / "out.parquet", ["Fe"])
    with pytest.raises(UsageError, match=r"a \.parquet file is written"):
        assign_file(tmp_path / "in.parquet", tmp_path / "out.csv", ["Fe"])
    with pytest.raises(UsageError, match="isn't among the elements"):
        assign_file(tmp_path / "in.parquet", tmp_path / "out.parquet", ["Kr"])
    assert sorted(path.name for path in tmp_path.iterdir()) == ["in.parquet", "text.parquet"]
