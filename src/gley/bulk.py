"""Tables larger than memory: read, assign and write Parquet in batches. Needs the extra `big` (pyarrow)."""

import os
import tempfile
from collections.abc import Sequence
from pathlib import Path

import pandas as pd

from gley.errors import GleyError, UsageError
from gley.settings import Settings
from gley.stability import assign

BATCH = 65_536
"""Samples held in memory at a time."""


def assign_file(
    source: str | Path, target: str | Path, elements: Sequence[str], settings: Settings | None = None,
    *, overwrite: bool = False,
) -> int:  # fmt: skip
    """Assign all samples of a Parquet file, batch by batch; the result is that of `assign` on the whole table.

    Parameters
    ----------
    source, target : path
        Parquet files; the columns of the first are those that `stability.assign` takes.
    elements : sequence of str
        Symbols on offer.
    settings : Settings, optional
        As for `assign`.
    overwrite : bool
        Replace an existing target.

    Returns
    -------
    int
        Rows written, one per sample and element.

    Raises
    ------
    UsageError, GleyError
        When pyarrow isn't there, a file isn't Parquet, the target exists, or it can't be written; nothing is left
        half-written.
    """
    try:
        import pyarrow as pa
        import pyarrow.parquet as pq
    except ImportError:
        message = "Parquet files need pyarrow."
        raise GleyError(message, "Install it with: pip install 'gley[big]'.") from None
    source, target = Path(source), Path(target)
    if target.suffix != ".parquet":
        message = f"{target}: a .parquet file is written."
        raise UsageError(message, f"Call it {target.stem}.parquet.")
    if target.exists() and not overwrite:
        message = f"{target} is there already; nothing was changed."
        raise GleyError(message, "Give another name, or overwrite=True.")
    try:
        file = pq.ParquetFile(source)
    except (OSError, pa.ArrowInvalid) as error:
        message = f"{source}: can't be read as Parquet ({error})."
        raise GleyError(message, "Check the path, or write it again.") from None
    handle, name = tempfile.mkstemp(prefix=f".{target.name}.", dir=target.parent)
    os.close(handle)
    try:
        written = _stream(file, name, elements, settings)
        os.replace(name, target)
    finally:
        Path(name).unlink(missing_ok=True)
    return written


def _stream(file, name: str, elements: Sequence[str], settings: Settings | None) -> int:
    """Batches from an open file into a new one of a fixed schema."""
    import pyarrow as pa
    import pyarrow.parquet as pq

    schema = pa.Schema.from_pandas(_typed(assign(pd.DataFrame({"sample": ["x"]}), elements, settings)))
    written = 0
    with pq.ParquetWriter(name, schema) as writer:
        for batch in file.iter_batches(BATCH):
            fields = _typed(assign(batch.to_pandas(), elements, settings))
            writer.write_table(pa.Table.from_pandas(fields, schema=schema, preserve_index=False))
            written += len(fields)
    return written


def _typed(fields: pd.DataFrame) -> pd.DataFrame:
    """Text columns as text even where a batch leaves them empty."""
    texts = {name: "str" for name in fields if fields[name].dtype == object}
    return fields.astype(texts)
