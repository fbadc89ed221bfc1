"""What if: the assignment under other assumptions that no measurement decides, and in how many of them it holds."""

from dataclasses import dataclass

import numpy as np
import pandas as pd

from gley.settings import Settings
from gley.stability import named_fields, species

_FERRIHYDRITE = "ferrihydrite (2-line)"
_OTHERS = (
    ("ferrihydrite at its least soluble", "ferrihydrite (6-line)"),
    ("ferrihydrite fresh from the gel", "iron(III) hydroxide (fresh gel)"),
)


@dataclass(frozen=True)
class Scenario:
    """One changed assumption: the settings under it, and by how much Eh moves (n,) or what it is taken from."""

    name: str
    settings: Settings
    Eh_mV: np.ndarray | None = None


def scenarios(waters: pd.DataFrame, couple_table: pd.DataFrame, settings: Settings) -> list[Scenario]:
    """The assumptions that are tried: those that can make a difference with these settings and data."""
    stated = settings.stability
    Eh = waters["Eh_mV"].to_numpy(float)
    found = []
    other = {"fresh": "aged", "aged": "fresh"}.get(stated.solids)
    if other:
        found.append(Scenario(f"{other} solids", settings.replace(stability={"solids": other})))
        for name, solid in _OTHERS:
            if stated.solids == "fresh" and solid not in stated.with_names:
                changed = {
                    "with_names": [*stated.with_names, solid],
                    "without_names": [*stated.without_names, _FERRIHYDRITE],
                }
                found.append(Scenario(name, settings.replace(stability=changed)))
    for name, choice in (("sulfur tied by Eh", "tied"), ("sulfate not reduced", "inert")):
        if choice != stated.sulfur:
            found.append(Scenario(name, settings.replace(stability={"sulfur": choice})))
    common = waters.get("Eh_sd_common_mV")
    if common is not None and (common.fillna(0) > 0).any():
        shift = common.fillna(0.0).to_numpy(float)
        found.append(Scenario("all readings of a day and probe too low", settings, Eh + shift))
        found.append(Scenario("all readings of a day and probe too high", settings, Eh - shift))
    iron = couple_table[couple_table["couple"] == "iron"].drop_duplicates("sample").set_index("sample")
    if len(iron) and settings.evidence.Eh_from != "iron":
        taken = iron["Eh_mV"].reindex(waters["sample"]).to_numpy(float)
        found.append(Scenario("Eh from the iron couple", settings, taken))
    return found


def scenario_table(
    fields: pd.DataFrame, waters: pd.DataFrame, couple_table: pd.DataFrame, settings: Settings
) -> pd.DataFrame:
    """Field of every assigned sample and element under each scenario.

    Parameters
    ----------
    fields, waters : DataFrame
        What `stability.assign` gave, and for what.
    couple_table : DataFrame
        What `couples_table` gave.
    settings : Settings
        Those of the assignment.

    Returns
    -------
    DataFrame
        `sample`, `element` and the columns of the vocabulary's table `scenarios`. A scenario that says nothing of a
        sample (no iron couple there) has no row for it.
    """
    base = fields[fields["field"] != ""].set_index(["sample", "element"])
    elements = list(dict.fromkeys(fields["element"]))
    tables = []
    for item in scenarios(waters, couple_table, settings):
        moved = waters if item.Eh_mV is None else waters.assign(Eh_mV=item.Eh_mV)
        found = named_fields(moved, elements, item.settings)
        found = found[found["field"] != ""].set_index(["sample", "element"])
        found = found[found.index.isin(base.index)]
        own = base.loc[found.index]
        kinds = [species()[name].kind for name in found["field"]]
        states = [f"{species()[name].element}({species()[name].oxidation_state})" for name in found["field"]]
        holds = (own["kind"].to_numpy() == kinds) & (own["oxidation_state"].to_numpy() == states)
        tables.append(
            found.assign(
                scenario=item.name, kind=kinds, oxidation_state=states, holds=np.where(holds, "yes", "no")
            ).reset_index()
        )
    names = ["sample", "element", "scenario", "field", "kind", "oxidation_state", "holds"]
    return pd.concat(tables, ignore_index=True)[names] if tables else pd.DataFrame(columns=names)


def with_robust(fields: pd.DataFrame, table: pd.DataFrame) -> pd.DataFrame:
    """Fields with `robust`: `5 of 7` scenarios in which the assignment holds."""
    counted = table.assign(yes=table["holds"] == "yes").groupby(["sample", "element"], sort=False)["yes"]
    words = counted.sum().astype(int).astype(str) + " of " + counted.count().astype(str)
    keys = pd.MultiIndex.from_frame(fields[["sample", "element"]])
    return fields.assign(robust=words.reindex(keys).fillna("").to_numpy(object))
