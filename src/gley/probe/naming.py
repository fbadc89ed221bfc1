"""Reference electrodes in the words of field sheets: which couple, which filling solution, or why that stays open."""

import re

FILL_UNKNOWN = "Ag/AgCl, fill unknown"
HYDROGEN = "hydrogen scale (already Eh)"

_SATURATED_KCL_mol_L = 4.1  # saturated KCl is 4.2 M at 25 °C and less in the cold; 4 M electrodes are sold beside it
_SALT = {"Ag/AgCl": "KCl", "calomel": "KCl", "Cu/CuSO4": "CuSO4", "Hg/Hg2SO4": "K2SO4"}
_COUPLES = {
    "Hg/Hg2SO4": (r"hg2?so4|mercurous?sul|mercurysul", {"mse"}),
    "Cu/CuSO4": (r"cuso4|coppersul|kupfersul", {"cse"}),
    "calomel": (r"[ck]alomel|hg2?cl2?", {"sce"}),
    "Ag/AgCl": (r"agcl|silver/?silver|silverchlor|silber", set()),
    HYDROGEN: (r"hydrogen|wasserstoff|alreadyeh|^eh$", {"she", "nhe"}),
}
_OTHER_SALTS = r"nacl|na2so4|h2so4|licl|nh4cl|\bhcl\b|seawater|meerwasser"
_POTENTIAL = r"\d\s*mv\s*(?:vs\.?|versus|against|gegen|zu)?\s*(?:the\s*)?(?:she|nhe)\b"
_SATURATED = r"(?<![a-z])sat|(?<![a-z])gesät|(?<![a-z])gesaet|\bges\."
_WITH_SILVER = r"(?<![a-z])(?:sat|ges)[a-zä']*\.?\s*(?:with|w/|mit|in)?\s*agcl|(?<!/)agcl[\s-]+(?:sat|ges)[a-zä]*\.?"
_UNKNOWN = r"unknown|unbekannt|nicht bekannt|not (?:known|stated|recorded|given)|\?"
_STRENGTH = r"(\d+(?:[.,]\d+)?)\s*-?\s*(?:m(?![a-z])|mol|n(?![a-z]))"


def couples(text: str) -> list[str]:
    """The couples a text names: none, one, or several when it contradicts itself.

    `Ag/AgCl, 3 M (207 mV vs SHE)` states the half-cell's own potential and names one.
    """
    plain = re.sub(_POTENTIAL, "", text.lower())
    words = set(re.findall(r"[a-z]+", plain))
    tight = re.sub(r"[\s_\-–]", "", plain)
    return [name for name, (pattern, short) in _COUPLES.items() if re.search(pattern, tight) or words & short]


def fill(text: str, couple: str) -> str:
    """The filling solution as the table's names have it after the couple; '' when the text leaves it open.

    A solution that isn't the couple's usual one is given as written, so that no table name fits it.

    Raises
    ------
    ValueError
        When the text states two filling solutions.
    """
    plain, salt = text.lower(), _SALT[couple]
    if re.search(_UNKNOWN, plain):
        return "fill unknown"
    if other := re.search(_OTHER_SALTS, plain):
        return other.group()
    strengths = {float(part.replace(",", ".")) for part in re.findall(_STRENGTH, plain)}
    if strengths and couple in ("Ag/AgCl", "calomel"):
        # '3 M KCl saturated with AgCl' is 3 M: the silver salt, not KCl, is at saturation
        plain = re.sub(_WITH_SILVER, "", plain)
    saturated = bool(re.search(_SATURATED, plain)) or "sce" in re.findall(r"[a-z]+", plain)
    if len(strengths) > 1 or (saturated and strengths and max(strengths) < _SATURATED_KCL_mol_L):
        raise ValueError
    if saturated or (not strengths and couple in ("Cu/CuSO4", "Hg/Hg2SO4")):
        return f"saturated {salt}"
    if not strengths:
        return ""
    (number,) = strengths
    return f"3.33 M {salt}" if abs(number - 10 / 3) < 0.04 else f"{number:g} M {salt}"
