"""What an element meets in the water: activities of ligand elements, as lines in pe that hold over an interval of pe.

Ligands are pools too and solved first. Carbonate and chloride keep one oxidation state. Sulfur stands as measured,
sulfate and sulfide side by side, or is tied by Eh: then each interval of pe has one sulfur state that takes the total,
solids keep their full dependence, and dissolved complexes with another state are left out there.
"""

from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass, field, replace

import numpy as np

from gley.stability.data import FIXED, SULFUR, species
from gley.stability.water import coefficients, log_sum, mean_by_amount, pool, pool_terms, product


@dataclass(frozen=True)
class Environment:
    """Ligand activities log a = α + β pe by channel, valid for lo ≤ pe < hi (arrays of n samples).

    `state` says which state a tied ligand is in, for example `S(VI)`; NaN in `alpha` means absent or unknown.
    `fences` bound it on a chart: pairs of level (n,) and slope, and level + slope · pe ≤ 0 holds inside. Where asked
    for, `per_pH` holds the change of each `alpha` per pH, and `fences_per_pH` that of each fence's level.
    """

    state: str
    alpha: Mapping[str, np.ndarray]
    beta: Mapping[str, float]
    lo: np.ndarray
    hi: np.ndarray
    left_out: frozenset[str] = frozenset()
    fences: tuple[tuple[np.ndarray, float], ...] = ()
    per_pH: Mapping[str, np.ndarray] = field(default_factory=dict)
    fences_per_pH: tuple[np.ndarray, ...] = ()

    def take(self, rows: np.ndarray) -> "Environment":
        """The same for some of the samples."""
        return replace(
            self, alpha={channel: level[rows] for channel, level in self.alpha.items()},
            lo=self.lo[rows], hi=self.hi[rows], fences=tuple((level[rows], slope) for level, slope in self.fences),
            per_pH={channel: rate[rows] for channel, rate in self.per_pH.items()},
            fences_per_pH=tuple(rate[rows] for rate in self.fences_per_pH),
        )  # fmt: skip


@dataclass(frozen=True)
class PoolLine:
    """log activity of an element as one of its pools sets it: `level` (n,) + `slope` · pe, and the level's change per
    pH (zeros where not asked for).
    """

    level: np.ndarray
    slope: float
    per_pH: np.ndarray


def pool_line(channel: str, X: np.ndarray, total: np.ndarray, rates: bool) -> PoolLine:
    """Activity at which a channel's forms sum to its total (n,); NaN where the total is 0 or unknown."""
    terms = pool_terms(channel, X)
    whole = log_sum(terms)
    with np.errstate(divide="ignore", invalid="ignore"):
        level = np.log10(total) - whole
    protons = np.array([float(item.h) for item in pool(channel)])
    per_pH = mean_by_amount(terms, whole, protons) if rates else np.zeros(len(X))
    return PoolLine(np.where(np.isfinite(level), level, np.nan), float(pool(channel)[0].e), per_pH)


def environments(
    X: np.ndarray, totals: Mapping[str, np.ndarray], needed: Collection[str], tied: bool, sulfur_solid: bool,
    rates: bool = False,
) -> list[Environment]:  # fmt: skip
    """Environments of n samples in order of rising pe.

    Parameters
    ----------
    X : ndarray (n, 7)
        Features.
    totals : mapping of channel to ndarray (n,)
        Totals in mol/L; NaN or 0 = not there. With `tied`, the channel `S` holds total sulfur.
    needed : collection of str
        Channels that somebody asks for; the others aren't worked out.
    tied : bool
        Sulfur tied by Eh instead of taken as measured.
    sulfur_solid : bool
        Whether elemental sulfur may take part when sulfur is tied.
    rates : bool
        Whether changes per pH are wanted too.
    """
    lines = {
        channel: pool_line(channel, X, totals[channel], rates)
        for channel in (*FIXED, *(() if tied else SULFUR))
        if channel in totals and channel in needed
    }
    n = len(X)
    if not tied or "S" not in totals or not SULFUR.keys() & needed:
        return [_whole("", lines, np.full(n, -np.inf), np.full(n, np.inf))]
    states = {channel: pool_line(channel, X, totals["S"], rates) for channel in SULFUR}
    if sulfur_solid:
        pure = -product(X, coefficients([species()["sulfur (rhombic)"]]))[:, 0]
        known = np.isfinite(states["S(VI)"].level)
        states["S(0)"] = PoolLine(np.where(known, pure, np.nan), 0.0, np.zeros(n))
    found = []
    for name, own in sorted(states.items(), key=lambda item: -item[1].slope):
        rivals = [line for other, line in states.items() if other != name]
        fences, fences_per_pH = _fences(own, rivals)
        lo, hi = interval(fences, n)
        missing = np.isnan(own.level)
        lo, hi = np.where(missing, -np.inf, lo), np.where(missing, np.inf, hi)
        whole = _whole(name, {**lines, **dict.fromkeys(SULFUR, own)}, lo, hi)
        others = frozenset(channel for channel in SULFUR if channel != name)
        found.append(replace(whole, left_out=others, fences=fences, fences_per_pH=fences_per_pH))
    return found


def _whole(state: str, lines: Mapping[str, PoolLine], lo: np.ndarray, hi: np.ndarray) -> Environment:
    """An environment from its channels' lines, without fences."""
    return Environment(
        state, {channel: line.level for channel, line in lines.items()},
        {channel: line.slope for channel, line in lines.items()}, lo, hi,
        per_pH={channel: line.per_pH for channel, line in lines.items()},
    )  # fmt: skip


def _fences(own: PoolLine, rivals: list[PoolLine]) -> tuple[tuple, tuple]:
    """Where a line is the lowest: level − rival + (slope − rival's slope) pe ≤ 0 for every rival; and per pH."""
    with np.errstate(invalid="ignore"):
        fences = tuple((own.level - other.level, own.slope - other.slope) for other in rivals)
        return fences, tuple(own.per_pH - other.per_pH for other in rivals)


def interval(fences: tuple, n: int) -> tuple[np.ndarray, np.ndarray]:
    """Interval of pe inside all fences, for n samples; empty where lo ≥ hi. A fence of NaN is none."""
    lo, hi = np.full(n, -np.inf), np.full(n, np.inf)
    for level, slope in fences:
        if slope == 0:
            lo = np.where(level > 0, np.inf, lo)
            continue
        bound = -level / slope
        bound = np.where(np.isnan(bound), np.inf if slope > 0 else -np.inf, bound)
        if slope > 0:
            hi = np.minimum(hi, bound)
        else:
            lo = np.maximum(lo, bound)
    return lo, hi


def with_companion(
    environment: Environment, channel: str, lines: Sequence[PoolLine], every: bool = False
) -> list[Environment]:
    """Split an environment by the winner of a companion metal, whose candidates' lines become a channel.

    Without `every`, environments that are empty for all samples are left out.
    """
    found = []
    for j, own in enumerate(lines):
        fences, fences_per_pH = _fences(own, [other for i, other in enumerate(lines) if i != j])
        lo, hi = interval(fences, len(own.level))
        lo, hi = np.maximum(lo, environment.lo), np.minimum(hi, environment.hi)
        if every or (lo < hi).any():
            level = np.where(np.isfinite(own.level), own.level, np.nan)
            own_environment = replace(
                environment, state=f"{environment.state} {channel}{j}".strip(), lo=lo, hi=hi,
                alpha={**environment.alpha, channel: level}, beta={**environment.beta, channel: own.slope},
                fences=environment.fences + fences, per_pH={**environment.per_pH, channel: own.per_pH},
                fences_per_pH=environment.fences_per_pH + fences_per_pH,
            )  # fmt: skip
            found.append(own_environment)
    return found
