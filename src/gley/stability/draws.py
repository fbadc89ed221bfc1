"""Quasi-random points over what a sample's field hangs on, and how far each sample's values may lie from the measured.

The same points serve every element and sample. Eh, pH and total vary per sample; a solid's log K is drawn once per
point, for all samples alike, because it is one constant of nature that we know badly.
"""

from dataclasses import dataclass
from functools import lru_cache
from statistics import NormalDist

import numpy as np
import pandas as pd

from gley.constants import LN10, nernst_slope_mV
from gley.settings import StabilitySettings
from gley.stability.systems import System

SOLID_LOG_K_SD = {"A": 0.2, "B": 0.4, "C": 0.8}
"""Standard deviation of a solid's log K per formula unit by grade of its row: grades are defined as reviewed and
cross-checked, single good source or ± 2-5 kJ, weak; a judgement of this project."""

_PRIMES = (2, 3, 5, 7, 11, 13, 17, 19, 23, 29, 31, 37, 41, 43, 47, 53, 59, 61, 67, 71, 73, 79)


@dataclass(frozen=True)
class Spread:
    """Standard deviations per sample (n,): Eh in pe units, pH, log10 of a total."""

    pe: np.ndarray
    pH: np.ndarray
    log_total: np.ndarray

    @classmethod
    def of(cls, samples: pd.DataFrame, stated: StabilitySettings) -> "Spread":
        """From the columns `Eh_sd_mV`, `pH_sd` or `pH_where`, `temperature_C`; defaults of the settings elsewhere."""
        n = len(samples)
        temperature = samples.get("temperature_C", pd.Series(np.full(n, np.nan))).to_numpy(float)
        slope = nernst_slope_mV(np.where(np.isnan(temperature), 25.0, temperature))
        Eh_sd = samples.get("Eh_sd_mV", pd.Series(np.full(n, np.nan))).to_numpy(float)
        where = samples.get("pH_where", pd.Series([""] * n)).fillna("").astype(str).to_numpy()
        pH_sd = np.where(where == "laboratory", stated.pH_sd_laboratory, stated.pH_sd_field)
        given = samples.get("pH_sd", pd.Series(np.full(n, np.nan))).to_numpy(float)
        pH_sd = np.where(np.isnan(given), pH_sd, given)
        total = np.full(n, stated.total_sd_percent / 100.0 / LN10)
        return cls(np.where(np.isnan(Eh_sd), 60.0, Eh_sd) / slope, pH_sd, total)

    def take(self, rows: np.ndarray) -> "Spread":
        """The same for some of the samples."""
        return Spread(self.pe[rows], self.pH[rows], self.log_total[rows])


@dataclass(frozen=True)
class Points:
    """D points: standard normal numbers for Eh, pH and total (D,), and shifts of log K of each member (D, S)."""

    pe: np.ndarray
    pH: np.ndarray
    log_total: np.ndarray
    log_K: np.ndarray

    @classmethod
    def of(cls, target: System, count: int) -> "Points":
        """Points for one element: one dimension for each of its solids beside the three of a sample."""
        solids = [i for i, item in enumerate(target.members) if not item.dissolved]
        normal = normal_points(count, min(3 + len(solids), len(_PRIMES)))
        log_K = np.zeros((count, len(target.members)))
        for column, i in zip(normal[:, 3:].T, solids, strict=False):
            log_K[:, i] = column * SOLID_LOG_K_SD[target.members[i].grade]
        return cls(normal[:, 0], normal[:, 1], normal[:, 2], log_K)


@lru_cache(maxsize=32)
def normal_points(count: int, dimensions: int) -> np.ndarray:
    """Quasi-random standard normal points (count, dimensions): Halton sequence through the normal quantile function.

    Halton 1960; a deterministic sequence, so that two runs agree to the last bit. Each column has mean 0 by symmetry:
    the second half mirrors the first.
    """
    half = (count + 1) // 2
    columns = [[_radical_inverse(i, _PRIMES[d]) for i in range(1, half + 1)] for d in range(dimensions)]
    quantile = NormalDist().inv_cdf
    points = np.array([[quantile(value) for value in column] for column in columns]).T
    return np.vstack([points, -points])[:count]


def _radical_inverse(index: int, base: int) -> float:
    value, factor = 0.0, 1.0 / base
    while index:
        index, digit = divmod(index, base)
        value += digit * factor
        factor /= base
    return value
