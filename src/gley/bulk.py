"""Tables larger than memory: read, assign and write Parquet in batches. Needs the extra `big` (pyarrow)."""

import os
import tempfile
from collections import deque
from collections.abc import Callable, Iterable, Iterator, Sequence
from concurrent.futures import Executor, Future, ThreadPoolExecutor
from pathlib import Path

import pandas as pd

from gley.errors import GleyError, UsageError
from gley.settings import Settings
from gley.stability import assign

BATCH = 32_768
"""Samples of one batch; as many batches as threads are held in memory."""


def assign_file(
    source: str | Path, target: str | Path, elements: Sequence[str], settings: Settings | None = None,
    *, overwrite: bool = False, threads: int = 0,
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
    threads : int
        Batches worked on at a time; 0 = as many as there are processors. Memory grows with them.

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
        written = _stream(file, name, elements, settings, threads or os.cpu_count() or 1)
        os.replace(name, target)
    finally:
        Path(name).unlink(missing_ok=True)
    return written


def _stream(file, name: str, elements: Sequence[str], settings: Settings | None, threads: int) -> int:
    """Batches from an open file into a new one of a fixed schema, some at a time."""
    import pyarrow as pa
    import pyarrow.parquet as pq

    def work(batch) -> pd.DataFrame:
        return _typed(assign(batch.to_pandas(), elements, settings))

    schema = pa.Schema.from_pandas(_typed(assign(pd.DataFrame({"sample": ["x"]}), elements, settings)))
    written = 0
    with pq.ParquetWriter(name, schema) as writer, ThreadPoolExecutor(threads) as pool:
        for fields in _in_order(pool, work, file.iter_batches(BATCH), threads):
            writer.write_table(pa.Table.from_pandas(fields, schema=schema, preserve_index=False))
            written += len(fields)
    return written


def _in_order(pool: Executor, work: Callable, batches: Iterable, ahead: int) -> Iterator[pd.DataFrame]:
    """Results in the order of the batches, with no more of them under way than the threads can take."""
    waiting: deque[Future] = deque()
    for batch in batches:
        waiting.append(pool.submit(work, batch))
        if len(waiting) > ahead:
            yield waiting.popleft().result()
    while waiting:
        yield waiting.popleft().result()


def _typed(fields: pd.DataFrame) -> pd.DataFrame:
    """Text columns as text even where a batch leaves them empty."""
    texts = {name: "str" for name in fields if fields[name].dtype == object}
    return fields.astype(texts)
