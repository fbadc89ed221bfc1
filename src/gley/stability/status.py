"""What limits an assignment, in words: what wasn't measured, was assumed, or can't be used."""

import numpy as np

from gley.stability.data import COMPANION
from gley.stability.systems import System, away_from_25
from gley.stability.water import DIC_MIN_PH, IMPLAUSIBLE_mV, beyond_water
from gley.stability.waters import LIGAND_INPUTS, MAX_IONIC_STRENGTH_M, Waters


class Remarks:
    """Words that concern some of n samples, kept in order; `texts` joins those of each sample."""

    def __init__(self, n: int) -> None:
        self._said: list[tuple[np.ndarray, str]] = []
        self._n = n

    def say(self, where: np.ndarray, words: str, first: bool = False) -> None:
        """Add words for the samples where it holds (n,); `first` puts them before all others."""
        self._said.insert(0, (where, words)) if first else self._said.append((where, words))

    def texts(self) -> np.ndarray:
        """`a; b` for each sample, `ok` where nothing was said (n,)."""
        pattern, known = np.zeros(self._n, int), [""]
        for where, words in self._said:
            if where.any():
                before, position = np.unique(pattern[where], return_inverse=True)
                pattern[where] = len(known) + position
                known += [f"{known[k]}; {words}" if known[k] else words for k in before]
        return np.array([text or "ok" for text in known], dtype=object)[pattern]


def usable(element: str, ready: Waters, remarks: Remarks) -> np.ndarray:
    """Which samples can be assigned (n,); the others get the reason as a remark."""
    total = ready.totals[element]
    reasons = (
        (np.isnan(ready.pH), "no pH"),
        ((ready.pH < 0) | (ready.pH > 14), "pH outside 0-14"),
        (np.isnan(ready.Eh_mV), "no Eh"),
        (np.abs(ready.Eh_mV) > 2000, "Eh outside ±2 V"),
        (np.isnan(total), f"{element} not measured"),
        (total == 0, f"{element} reported as zero"),
        ((total < 0) | np.isinf(total), f"{element} isn't a concentration"),
        (ready.ionic_strength_M < 0, "ionic strength isn't a concentration"),
    )
    fit = np.ones(len(total), bool)
    for where, words in reasons:
        remarks.say(where & fit, f"not assigned: {words}", first=True)
        remarks.say(where & ~fit, words)
        fit &= ~where
    return fit


def limits_of(element: str, target: System, ready: Waters) -> Remarks:
    """What limits each sample's answer before anything is computed."""
    remarks = Remarks(len(ready.pH))
    remarks.say(ready.assumed[element], "assumed total")
    for value in np.unique(ready.temperature_C[ready.temperature_assumed]):
        here = ready.temperature_assumed & (ready.temperature_C == value)
        remarks.say(here, f"temperature assumed: {value:g} °C")
    for channel in target.channels:
        if channel == COMPANION:
            remarks.say(np.isnan(ready.totals[COMPANION]), f"companion not measured: {COMPANION}")
            continue
        remarks.say(ready.assumed[channel], f"ligand assumed: {channel}")
        if channel == "S(-II)":
            continue
        unknown = np.isnan(ready.ligands[channel]) & ~np.isnan(ready.pH)
        acid = ready.too_acid & unknown if channel == "C(IV)" else np.zeros(len(unknown), bool)
        remarks.say(acid, f"inorganic carbon unknown below pH {DIC_MIN_PH:g}")
        remarks.say(unknown & ~acid, f"ligand not measured: {LIGAND_INPUTS[channel]}")
    no_sulfide = np.isnan(ready.ligands["S(-II)"])
    if "S(-II)" in target.channels:
        remarks.say(ready.tied & no_sulfide, "sulfide computed")
        remarks.say(no_sulfide & ~ready.tied, "ligand not measured: sulfide")
    elif element == "S":
        remarks.say(no_sulfide, "sulfide not measured: total is sulfate alone")
    for name in [item.name for item in target.members if item.only_at_25]:
        remarks.say(away_from_25(ready.X), f"{name} left out: known at 25 °C only")
    beyond = np.abs(beyond_water(ready.pH, ready.Eh_mV, ready.temperature_C))
    remarks.say(beyond > IMPLAUSIBLE_mV, "Eh outside water's stability: not to be used")
    strong = ready.ionic_strength_M > MAX_IONIC_STRENGTH_M
    remarks.say(strong, f"ionic strength above {MAX_IONIC_STRENGTH_M:g} M: activities uncertain")
    return remarks
