"""Settings of a run: the only place where a default lives. TOML file first, options of the command over it.

Each group is a frozen dataclass; each field carries its unit and meaning, from which `survey.toml` and the run stamp
are written. Unknown names and values out of range are reported all at once.
"""

import dataclasses
import difflib
import math
import tomllib
from dataclasses import dataclass, field
from itertools import pairwise
from pathlib import Path
from typing import Any

from gley.columns import constituents
from gley.errors import UsageError


def _set(
    default: Any, meaning: str, unit: str = "", allowed: tuple = (), low: float | None = None,
    high: float | None = None, example: str = "",
) -> Any:  # fmt: skip
    """A field with its meaning; `allowed` closes the choice, `low` and `high` bound a number."""
    metadata = {"meaning": meaning, "unit": unit, "allowed": allowed, "low": low, "high": high, "example": example}
    if isinstance(default, dict):
        return field(default_factory=lambda: dict(default), metadata=metadata)
    return field(default=default, metadata=metadata)


@dataclass(frozen=True)
class SurveySettings:
    """How the files are read."""

    crs: str = _set("", "coordinate reference system, e.g. EPSG:25832; 'none' = no maps and GIS layers")
    encoding: str = _set("", "encoding of text files when it isn't UTF-8 or Windows-1252")
    columns: dict = _set(
        {},
        "header as it stands in the file = column of the house vocabulary, 'ignore' to leave out",
        example='{ "Hell voltage (mV)" = "ORP_mV", "Bottle code" = "ignore" }',
    )
    units: dict = _set(
        {}, "column or constituent = unit, where the file names none", example='{ Fe = "mg/L", SC_uS_cm = "mS/cm" }'
    )


@dataclass(frozen=True)
class ProbeSettings:
    """How ORP becomes Eh."""

    electrode: str = _set("", "reference electrode where the file names none, e.g. 'Ag/AgCl, 3 M KCl'")
    offset_mV: float | None = _set(
        None,
        "own half-cell potential against SHE, instead of a table value",
        "mV",
        low=-2000,
        high=2000,
        example="207.0",
    )
    sd_poised_mV: float = _set(15.0, "standard deviation of Eh, poised water and checked probe", "mV", low=0)
    sd_checked_mV: float = _set(30.0, "standard deviation of Eh, checked probe", "mV", low=0)
    sd_unchecked_mV: float = _set(60.0, "standard deviation of Eh, no check reading", "mV", low=0)
    sd_fill_unknown_mV: float = _set(10.0, "added in quadrature when the filling solution is unknown", "mV", low=0)
    sd_no_temperature_mV: float = _set(10.0, "added in quadrature when no temperature was measured", "mV", low=0)
    check_good_mV: float = _set(5.0, "check solution: deviation called good", "mV", low=0)
    check_accepted_mV: float = _set(10.0, "check solution: deviation accepted", "mV", low=0)
    check_flagged_mV: float = _set(15.0, "check solution: flagged but applied; above, not applied", "mV", low=0)


@dataclass(frozen=True)
class StabilitySettings:
    """Which elements, which solids, which assumptions."""

    elements: tuple = _set((), "elements to assign; none given = the measured ones on offer")
    solids: str = _set("fresh", "solid set", allowed=("fresh", "aged", "none"))
    with_names: tuple = _set((), "species or solids added by name")
    without_names: tuple = _set((), "species or solids left out by name")
    assumed_mol_L: dict = _set(
        {},
        "constituent = total taken where it was not measured (DIC for carbonate)",
        "mol/L",
        low=0,
        high=10,
        example="{ DIC = 3e-3, SO4 = 5e-4 }",
    )
    assumed_soil_mol_L: float = _set(1e-5, "total of Fe and Mn taken for soils without metals", "mol/L", low=0)
    assumed_temperature_C: float = _set(25.0, "temperature where none is known for the round", "°C", low=-5, high=100)
    sulfur: str = _set(
        "measured",
        "sulfate and sulfide as measured (tied by Eh where sulfide wasn't), always tied, or sulfate inert",
        allowed=("measured", "tied", "inert"),
    )
    default_ionic_strength_M: float = _set(0.010, "ionic strength where nothing tells it", "mol/L", low=0)
    charge_balance_percent: float = _set(10.0, "majors give the ionic strength if they balance within this", "%", low=0)
    pH_sd_field: float = _set(0.1, "standard deviation of a field pH", low=0)
    pH_sd_laboratory: float = _set(0.3, "standard deviation of a laboratory pH", low=0)
    total_sd_percent: float = _set(10.0, "relative standard deviation of a concentration", "%", low=0)
    draws: int = _set(256, "quasi-random points per sample for probabilities", low=16, high=4096)
    clear: float = _set(0.95, "probability from which an assignment is called clear", low=0, high=1)
    likely: float = _set(0.67, "probability from which it is called likely", low=0, high=1)
    near_SI: float = _set(0.5, "|SI| up to which a solid is near saturation", low=0)
    near_SI_fresh: float = _set(1.0, "the same for solids of the fresh set", low=0)


@dataclass(frozen=True)
class EvidenceSettings:
    """Whose potential counts, and thresholds of the redox process (McMahon & Chapelle 2008; Chapelle et al. 2009)."""

    Eh_from: str = _set(
        "pt", "potential taken for all elements: the platinum electrode's, or a measured couple's where there is one",
        allowed=(
            "pt", "iron", "iron dissolved", "manganese", "arsenic", "chromium", "selenium", "antimony", "sulfur",
            "nitrogen", "nitrite", "carbon", "oxygen",
        ),
    )  # fmt: skip
    O2_mg_L: float = _set(0.5, "dissolved oxygen: from here on oxic", "mg/L", low=0)
    NO3_N_mg_L: float = _set(0.5, "nitrate as nitrogen: from here on nitrate prevails", "mg/L", low=0)
    Mn_ug_L: float = _set(50.0, "manganese: from here on Mn(IV) is reduced", "µg/L", low=0)
    Fe_ug_L: float = _set(100.0, "iron: from here on Fe(III) or sulfate is reduced", "µg/L", low=0)
    SO4_mg_L: float = _set(0.5, "sulfate: below it methane is formed", "mg/L", low=0)
    ratio_high: float = _set(10.0, "Fe/sulfide mass ratio above which iron reduction prevails", low=0)
    ratio_low: float = _set(0.3, "Fe/sulfide mass ratio below which sulfate reduction prevails", low=0)


@dataclass(frozen=True)
class ChartSettings:
    """Axes and look of charts and maps."""

    pH_min: float = _set(4.0, "left end of the pH axis", low=0, high=14)
    pH_max: float = _set(10.0, "right end of the pH axis", low=0, high=14)
    Eh_min_mV: float = _set(-400.0, "lower end of the Eh axis", "mV", low=-2500, high=2500)
    Eh_max_mV: float = _set(800.0, "upper end of the Eh axis", "mV", low=-2500, high=2500)
    dpi: int = _set(300, "resolution of PNG figures", low=50, high=1200)
    over: tuple = _set(("As/Fe",), "overlays drawn for a survey, OVER/UNDER, where both elements were assigned")
    fan: bool = _set(True, "draw how far lines move between the P10 and P90 of the totals")
    background_mismatch: float = _set(
        0.30, "share of points off their drawn field from which the chart says so", low=0, high=1
    )


@dataclass(frozen=True)
class ReportSettings:
    """Words for the title block."""

    title: str = _set("", "title of the report")
    project: str = _set("", "project or client reference")
    prepared_by: str = _set("", "who prepared it")


@dataclass(frozen=True)
class Settings:
    """All groups together; frozen, compared and stamped as a whole."""

    survey: SurveySettings = field(default_factory=SurveySettings)
    probe: ProbeSettings = field(default_factory=ProbeSettings)
    stability: StabilitySettings = field(default_factory=StabilitySettings)
    evidence: EvidenceSettings = field(default_factory=EvidenceSettings)
    chart: ChartSettings = field(default_factory=ChartSettings)
    report: ReportSettings = field(default_factory=ReportSettings)

    def as_dict(self) -> dict[str, Any]:
        """Nested plain values for the run stamp."""
        return dataclasses.asdict(self)

    def replace(self, **groups: dict[str, Any]) -> "Settings":
        """A copy with some values changed: `settings.replace(probe={"electrode": "..."})`."""
        return _merge(self, groups, "the command line")


def load(path: str | Path | None = None, **groups: dict[str, Any]) -> Settings:
    """Settings from a TOML file, with values of the command line over it.

    Raises
    ------
    UsageError
        Listing every unknown name, wrong type and value out of range at once.
    """
    settings = Settings()
    if path is not None:
        try:
            tables = tomllib.loads(Path(path).read_text(encoding="utf-8"))
        except OSError as error:
            message = f"{path}: can't be read ({error.strerror})."
            raise UsageError(message, "Check the path of --settings.") from None
        except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
            message = f"{path}: not valid TOML ({error})."
            raise UsageError(message, "templates/survey.toml shows the form.") from None
        settings = _merge(settings, tables, str(path))
    return _merge(settings, groups, "the command line")


def _merge(settings: Settings, tables: dict[str, Any], origin: str) -> Settings:
    problems: list[str] = []
    changed = {}
    groups = {item.name: getattr(settings, item.name) for item in dataclasses.fields(settings)}
    for name, values in tables.items():
        if name not in groups or not isinstance(values, dict):
            problems.append(f"[{name}] is no group; there are {', '.join(groups)}")
            continue
        fields = {item.name: item for item in dataclasses.fields(groups[name])}
        accepted = {}
        for key, value in values.items():
            if key not in fields:
                near = difflib.get_close_matches(key, fields, 1)
                problems.append(f"[{name}] {key} is unknown" + (f"; did you mean {near[0]}" if near else ""))
                continue
            fault = _fault(fields[key], value)
            if fault:
                problems.append(f"[{name}] {key} = {value!r}: {fault}")
            else:
                accepted[key] = tuple(value) if isinstance(value, list) else value
        changed[name] = dataclasses.replace(groups[name], **accepted)
    merged = dataclasses.replace(settings, **changed)
    problems += _contradictions(merged)
    if problems:
        message = f"{origin}: " + "; ".join(problems) + "."
        raise UsageError(message, "templates/survey.toml lists every name with its unit and default.")
    return merged


def _fault(item: dataclasses.Field, value: Any) -> str:
    """What is wrong with a value for a field, or nothing."""
    default = item.default if item.default is not dataclasses.MISSING else {}
    allowed = item.metadata["allowed"]
    if isinstance(default, bool):
        return "" if isinstance(value, bool) else "true or false is wanted"
    if isinstance(default, (int, float)) or default is None:
        return _number_fault(item, value, whole=isinstance(default, int))
    if isinstance(default, dict):
        return _table_fault(item, value)
    if isinstance(default, tuple):
        ok = isinstance(value, (list, tuple)) and all(isinstance(part, str) for part in value)
        return "" if ok else "a list of names is wanted"
    if not isinstance(value, str):
        return "text is wanted"
    return f"one of {', '.join(allowed)} is wanted" if allowed and value not in allowed else ""


def _number_fault(item: dataclasses.Field, value: Any, whole: bool = False) -> str:
    low, high = item.metadata["low"], item.metadata["high"]
    if isinstance(value, bool) or not isinstance(value, (int, float)) or not math.isfinite(value):
        return "a number is wanted"
    if whole and value != int(value):
        return "a whole number is wanted"
    if (low is not None and value < low) or (high is not None and value > high):
        return f"{low:g} to {high:g} is wanted" if high is not None else f"at least {low:g} is wanted"
    return ""


def _table_fault(item: dataclasses.Field, value: Any) -> str:
    """A table of names: with numbers by constituent where the field has bounds, with text otherwise."""
    if not isinstance(value, dict):
        return "a table of name = value is wanted"
    for name, part in value.items():
        if item.metadata["low"] is None:
            if not isinstance(part, str):
                return f"{name}: text is wanted"
            continue
        if name not in constituents() or name == "alkalinity":
            near = difflib.get_close_matches(name, constituents(), 1, 0.3)
            return f"{name} is no constituent" + (f"; did you mean {near[0]}" if near else "")
        fault = _number_fault(item, part)
        if fault:
            return f"{name}: {fault}"
    return ""


_ORDERED = (
    ("chart", ("pH_min", "pH_max"), True),
    ("chart", ("Eh_min_mV", "Eh_max_mV"), True),
    ("probe", ("check_good_mV", "check_accepted_mV", "check_flagged_mV"), False),
    ("stability", ("likely", "clear"), False),
    ("evidence", ("ratio_low", "ratio_high"), False),
)
"""Settings that must rise from one to the next; the flag says that they must differ."""


def _contradictions(settings: "Settings") -> list[str]:
    """Settings that don't go together."""
    problems = []
    for group, names, strictly in _ORDERED:
        values = [getattr(getattr(settings, group), name) for name in names]
        for before, after in pairwise(range(len(values))):
            if values[before] > values[after] or (strictly and values[before] == values[after]):
                problems.append(
                    f"[{group}] {names[before]} = {values[before]:g} must lie below {names[after]} = {values[after]:g}"
                )
    return problems


def template() -> str:
    """The commented `survey.toml` that lists every setting with unit, meaning and default."""
    lines = ["# Settings of a gley run. Every line is optional; the values shown are the defaults.", ""]
    for group in dataclasses.fields(Settings):
        value = getattr(Settings(), group.name)
        lines += [f"[{group.name}]  # {(type(value).__doc__ or '').splitlines()[0]}"]
        for item in dataclasses.fields(value):
            unit = f" [{item.metadata['unit']}]" if item.metadata["unit"] else ""
            choice = f" ({' | '.join(item.metadata['allowed'])})" if item.metadata["allowed"] else ""
            lines.append(f"# {item.metadata['meaning']}{unit}{choice}")
            example = item.metadata["example"]
            shown = example or _toml(getattr(value, item.name))
            lines.append(f"#{item.name} = {shown}{'  # an example; none is set' if example else ''}")
        lines.append("")
    return "\n".join(lines)


def _toml(value: Any) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return f'"{value}"'
    if isinstance(value, dict):
        return "{ }"
    if isinstance(value, tuple):
        return "[" + ", ".join(f'"{part}"' for part in value) + "]"
    return repr(value)
