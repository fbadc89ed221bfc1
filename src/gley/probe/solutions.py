"""Check solutions: the potential each should show on the hydrogen scale, against temperature."""

import re
from functools import cache
from types import MappingProxyType
from typing import Any

from gley.probe.electrodes import described, read_curves

_SAME_BUFFER_pH = 0.015  # 4.01 and 7.01 are the same buffers; 0.01 is 0.6 mV


@cache
def curves() -> MappingProxyType:
    """All check solutions by name."""
    return read_curves("solutions.csv", "solution", "Eh_mV")


def solutions() -> list[dict[str, Any]]:
    """The table as plain values: name, published range [°C], source, seen, grade, note."""
    return [described(item) for item in curves().values()]


def find_solution(text: str) -> str:
    """The table's name for a check solution as people write it; '' when it isn't one we know.

    A quinhydrone buffer must state its pH, 4 or 7 to 0.01: others (6.86, 4.65) show another potential.
    """
    plain = re.sub(r"[\s'’_()-]", "", str(text)).lower()
    if re.search("zobell?", plain):
        return "ZoBell"
    if re.match(r"light(?:s|solution|ssolution|standard|$)", plain):
        return "Light"
    stated = re.search(r"ph(\d+(?:[.,]\d+)?)", plain) if re.search("quinh|chinh", plain) else None
    pH = float(stated.group(1).replace(",", ".")) if stated else 0.0
    near = [whole for whole in (4, 7) if abs(pH - whole) < _SAME_BUFFER_pH]
    return f"quinhydrone pH {near[0]}" if near else ""
