"""How fast samples are assigned, as ratios measured side by side in one run.

    python tests/benchmarks/bench_assign.py [samples]

(a) reading the same table with pandas from CSV, (b) the bare product + log-sum + argmin of the same size: what any
engine on this matrix must do, (c) fields only, (d) fields with exact margins, (e) everything `assign` gives,
probabilities too. Ratios are to (b).
"""

import io
import sys
import time
from collections.abc import Callable

import numpy as np
import pandas as pd

from gley.settings import Settings
from gley.stability import assign, march, margins
from gley.stability.solve import Choice, solve
from gley.stability.waters import waters

ELEMENTS = ("Fe", "Mn", "As")
BLOCK = 8192


def made_up(count: int) -> pd.DataFrame:
    """Waters of every kind, seeded."""
    rng = np.random.default_rng(7)
    return pd.DataFrame(
        {
            "sample": [f"s{i}" for i in range(count)],
            "pH": rng.uniform(5, 9, count),
            "Eh_mV": rng.uniform(-300, 700, count),
            "Eh_sd_mV": 30.0,
            "temperature_C": rng.uniform(4, 22, count),
            "SC_uS_cm": rng.uniform(100, 3000, count),
            "Fe_mol_L": 10 ** rng.uniform(-7, -3.5, count),
            "Mn_mol_L": 10 ** rng.uniform(-7, -4.5, count),
            "As_mol_L": 10 ** rng.uniform(-8.5, -5, count),
            "alkalinity_eq_L": 10 ** rng.uniform(-3.3, -2, count),
            "SO4_mol_L": 10 ** rng.uniform(-5, -2.5, count),
            "sulfide_mol_L": 10 ** rng.uniform(-8, -4, count),
            "Cl_mol_L": 1e-3,
        }
    )


def seconds(job: Callable[[], object]) -> float:
    """Best of two runs."""
    best = float("inf")
    for _ in range(2):
        start = time.perf_counter()
        job()
        best = min(best, time.perf_counter() - start)
    return best


def bare(X: np.ndarray, target) -> None:
    """Product, log-sum over all species, argmin, block by block."""
    for start in range(0, len(X), BLOCK):
        q = X[start : start + BLOCK] @ target.matrix
        top = q.max(axis=1, keepdims=True)
        total = top[:, 0] + np.log10(np.power(10.0, q - top).sum(axis=1))
        (q - total[:, None]).argmin(axis=1)


def measure(count: int) -> dict[str, float]:
    """Seconds per kind of work, summed over the elements."""
    table = made_up(count)
    text = table.to_csv(index=False)
    settings = Settings()
    choice = Choice()
    found = {"a read csv": seconds(lambda: pd.read_csv(io.StringIO(text))), "b bare": 0.0, "c fields": 0.0}
    found |= {"d fields, margins": 0.0, "e assign": 0.0}
    for element in ELEMENTS:
        ready, target = waters(table, (element,), settings.stability), choice.system(element)
        blocks = [np.arange(start, min(start + BLOCK, count)) for start in range(0, count, BLOCK)]

        def fields(ready=ready, target=target, blocks=blocks, element=element, far: bool = False) -> None:
            for rows in blocks:
                bath, log_total = ready.bath(rows, False), ready.log_total(element, rows)
                solved = solve(target, bath, ready.pe[rows], log_total, choice)
                if far:
                    margins.along_pe(target, bath, ready.pe[rows], log_total, solved.field, choice)
                    march.along_pH(target, bath, ready.pe[rows], log_total, solved.field, choice)

        found["b bare"] += seconds(lambda ready=ready, target=target: bare(ready.X, target))
        found["c fields"] += seconds(fields)
        found["d fields, margins"] += seconds(lambda fields=fields: fields(far=True))
        found["e assign"] += seconds(lambda element=element: assign(table, [element], settings))
    return found


def main(count: int) -> None:
    """Print the table."""
    found = measure(count)
    base = found["b bare"]
    print(f"{count} samples x {len(ELEMENTS)} elements")
    for name, value in found.items():
        each = 1e6 * value / count / len(ELEMENTS)
        print(f"{name:<20}{value:9.3f} s   {value / base:8.1f} x bare   {each:8.1f} µs each")


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 20_000)
