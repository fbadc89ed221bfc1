"""Check solutions: the potential each should show on the hydrogen scale, against temperature."""

import re
from functools import cache
from types import MappingProxyType
from typing import Any

from gley.probe.electrodes import described, read_curves


@cache
def curves() -> MappingProxyType:
    """All check solutions by name."""
    return read_curves("solutions.csv", "solution", "Eh_mV")


def solutions() -> list[dict[str, Any]]:
    """The table as plain values: name, published range [°C], source, seen, grade, note."""
    return [described(item) for item in curves().values()]


def find_solution(text: str) -> str:
    """The table's name for a check solution as people write it; '' when it isn't one we know."""
    plain = re.sub(r"[\s'’_-]", "", str(text)).lower()
    if "zobell" in plain:
        return "ZoBell"
    if plain.startswith("light"):
        return "Light"
    buffer = re.search(r"(?:quinh|chinh).*?ph(4|7)(?:[.,]0\d?)?$", plain)
    return f"quinhydrone pH {buffer.group(1)}" if buffer else ""
