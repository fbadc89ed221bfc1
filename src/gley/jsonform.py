"""Records as JSON text: NaN and infinities as null, numpy values as plain ones, letters as they are."""

import json
import math
from typing import Any


def to_json(record: Any) -> str:
    """JSON text of nested dicts, lists and values; what JSON doesn't know is written as text."""
    return json.dumps(_plain(record), ensure_ascii=False, indent=1, allow_nan=False)


def _plain(value: Any) -> Any:
    if isinstance(value, dict):
        return {str(key): _plain(part) for key, part in value.items()}
    if isinstance(value, (list, tuple)):
        return [_plain(part) for part in value]
    if hasattr(value, "item"):  # numpy scalars
        value = value.item()
    if isinstance(value, float) and not math.isfinite(value):
        return None
    return value if isinstance(value, (str, int, float, bool, type(None))) else str(value)
