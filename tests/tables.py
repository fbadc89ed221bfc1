"""Small tables in the house form for tests that don't read files."""

import numpy as np
import pandas as pd

from gley.columns import columns


def table(kind, rows):
    """A `samples`, `stations` or `checks` table from dicts, all columns of the vocabulary there."""
    made = {}
    for name, column in columns(kind).items():
        values = [row.get(name) for row in rows]
        if column.dtype == "number":
            made[name] = pd.Series([np.nan if v is None else v for v in values], dtype=float)
        elif column.dtype == "date":
            made[name] = pd.Series(pd.to_datetime(pd.Series(values, dtype=object)), dtype="datetime64[ns]")
        else:
            made[name] = pd.Series(["" if v is None else v for v in values], dtype=object)
    return pd.DataFrame(made)
