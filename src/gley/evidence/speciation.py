"""What the analysis itself says of an element's oxidation state, beside the state that Eh and pH assign."""

import numpy as np
import pandas as pd

from gley.findings import Findings, some
from gley.settings import Settings
from gley.stability import couples, named_fields, species

_PAIRS = {"Fe": "iron dissolved", "As": "arsenic", "Cr": "chromium", "Se": "selenium", "Sb": "antimony", "S": "sulfur"}
"""The couple of two dissolved states of an element."""


def with_measured(
    fields: pd.DataFrame, waters: pd.DataFrame, couple_table: pd.DataFrame, settings: Settings, findings: Findings
) -> pd.DataFrame:
    """Fields with `state_measured` and `field_measured` filled where both states of an element were analysed.

    Parameters
    ----------
    fields, waters : DataFrame
        What `stability.assign` gave, and for what.
    couple_table : DataFrame
        What `couples_table` gave.
    settings : Settings
        Those of the assignment.
    findings : Findings
        Gets a note for each element whose measured state is another than the assigned one.
    """
    table = fields.copy()
    for element in dict.fromkeys(fields["element"]):
        name = _PAIRS.get(element)
        own = couple_table[couple_table["couple"] == name].drop_duplicates("sample").set_index("sample")
        if name is None or not len(own):
            continue
        at = waters[waters["sample"].isin(own.index)].copy()
        at["Eh_mV"] = own["Eh_mV"].reindex(at["sample"]).to_numpy(float)
        found = named_fields(at, [element], settings).set_index("sample")["field"]
        rows = table.index[(table["element"] == element) & table["sample"].isin(own.index)]
        samples = table.loc[rows, "sample"]
        table.loc[rows, "field_measured"] = found.reindex(samples).to_numpy(object)
        words, more = _states(element, name, own["share_oxidised"].reindex(samples).to_numpy(float))
        table.loc[rows, "state_measured"] = words
        _say(table.loc[rows], element, more, findings)
    return table


def _states(element: str, name: str, oxidised: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """`As(III) 82 %` for each sample from the oxidised share, and the state alone."""
    couple = couples()[name]
    more = np.where(oxidised >= 0.5, f"{element}({couple.oxidised})", f"{element}({couple.reduced})").astype(object)
    share = np.where(oxidised >= 0.5, oxidised, 1.0 - oxidised)
    words = [f"{state} {100 * part:.0f} %" for state, part in zip(more, share, strict=True)]
    return np.array(words, dtype=object), more


def _say(part: pd.DataFrame, element: str, measured: np.ndarray, findings: Findings) -> None:
    """A note where the dissolved form that was assigned is in another state than the analysis found."""
    assigned = [species()[name].oxidation_state if name else "" for name in part["dissolved_form"]]
    states = np.array([f"{element}({state})" if state else "" for state in assigned], dtype=object)
    other = part["sample"][(states != measured) & (states != "")]
    if len(other):
        findings.add(
            "evidence.state_differs", element=element, count=len(other), total=len(part), names=some(other)
        )  # fmt: skip
