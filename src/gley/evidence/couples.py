"""Measured couples beside the platinum electrode: what potential each implies, and whether the two agree.

Couples of one water seldom agree with each other or with platinum (common practice since Lindberg & Runnells 1984,
Science 225: 925-927): a difference says that the water isn't at redox equilibrium, not that a reading is wrong.
"""

import numpy as np
import pandas as pd

from gley.constants import nernst_slope_mV
from gley.findings import Findings, some
from gley.settings import Settings
from gley.stability import couple_potentials

PLATINUM = "pt"
_APART = 2.0  # standard deviations of the difference
_COMPARED = ("iron", "iron dissolved", "sulfur")
"""Couples a platinum electrode can answer to, at least in part (common practice); for the others no finding is made."""


def couples_table(waters: pd.DataFrame, settings: Settings, findings: Findings) -> pd.DataFrame:
    """Potential of every measured couple beside the platinum electrode's.

    Parameters
    ----------
    waters : DataFrame
        As for `stability.assign`, with `Eh_mV`, `Eh_sd_mV` of the electrode.
    settings : Settings
        As for `stability.couple_potentials`.
    findings : Findings
        Gets a note for each couple that differs.

    Returns
    -------
    DataFrame
        `sample` and the columns of the vocabulary's table `couples`.
    """
    table = couple_potentials(waters, settings)
    read = waters.set_index("sample")[["Eh_mV", "Eh_sd_mV"]].reindex(table["sample"])
    platinum, sd = (read[name].to_numpy(float) for name in read)
    difference = platinum - table["Eh_mV"].to_numpy(float)
    both = np.hypot(sd, table["Eh_sd_mV"].to_numpy(float))
    words = np.where(difference > 0, "platinum higher", "platinum lower").astype(object)
    words = np.where(np.abs(difference) <= _APART * both, "agree", words)
    table.insert(4, "platinum_mV", platinum)
    table.insert(5, "difference_mV", difference)
    table.insert(6, "agreement", np.where(np.isnan(difference), "", words))
    for couple, part in table.groupby("couple", sort=False):
        apart = part[part["agreement"].str.startswith("platinum")]
        if couple in _COMPARED and len(apart):
            names = some(apart["sample"])
            findings.add("evidence.couples_differ", value=couple, count=len(apart), total=len(part), names=names)
    return table


def Eh_from(eh: pd.DataFrame, samples: pd.Series, table: pd.DataFrame, settings: Settings, findings: Findings):
    """The table of Eh with the potential of the chosen couple where a sample has it, the electrode's elsewhere.

    Parameters
    ----------
    eh : DataFrame
        What `probe.to_Eh` gave.
    samples : Series
        The samples' names, with the same index.
    table : DataFrame
        What `couples_table` gave.
    settings : Settings
        `evidence.Eh_from` names the couple; `pt` changes nothing.
    findings : Findings
        Gets what was taken, and whose couple is missing.
    """
    chosen = settings.evidence.Eh_from
    if chosen == PLATINUM:
        return eh
    own = table[table["couple"] == chosen].drop_duplicates("sample").set_index("sample").reindex(samples)
    there = own["Eh_mV"].notna().to_numpy()
    value, sd = own["Eh_mV"].to_numpy(float), own["Eh_sd_mV"].to_numpy(float)
    basis = (f"{chosen} couple: " + own["basis"]).to_numpy(object)
    changed = eh.assign(
        Eh_platinum_mV=eh["Eh_mV"], Eh_mV=np.where(there, value, eh["Eh_mV"]),
        Eh_sd_mV=np.where(there, sd, eh["Eh_sd_mV"]), Eh_sd_own_mV=np.where(there, sd, eh["Eh_sd_own_mV"]),
        Eh_sd_common_mV=np.where(there, 0.0, eh["Eh_sd_common_mV"]),
        Eh_basis=np.where(there, basis, eh["Eh_basis"]), Eh_status=np.where(there, "ok", eh["Eh_status"]),
    )  # fmt: skip
    changed["pe"] = changed["Eh_mV"] / nernst_slope_mV(eh["temperature_used_C"].to_numpy(float))
    if there.any():
        shown = some(dict.fromkeys(own.loc[there, "basis"]), 3)
        findings.add("evidence.Eh_from_couple", value=chosen, count=int(there.sum()), basis=shown)
    if not there.all():
        names = some(samples[~there])
        findings.add("evidence.couple_missing", value=chosen, count=int((~there).sum()), names=names)
    return changed
