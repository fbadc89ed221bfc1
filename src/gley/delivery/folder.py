"""A folder written whole or not at all: built beside its place, then renamed; the old one stays till then."""

import os
import shutil
import tempfile
from collections.abc import Callable
from pathlib import Path

from gley.errors import GleyError

STAMP = "run.json"
"""The file that marks a folder as one of ours."""


def previous(folder: Path) -> Path:
    """Where the old folder waits while the new one takes its place."""
    return folder.with_name(folder.name + ".previous")


def restore(folder: Path) -> bool:
    """Put the old folder back when an earlier run was stopped between the two renames; True when it did."""
    old = previous(folder)
    if old.is_dir() and not folder.exists():
        os.replace(old, folder)
        return True
    return False


def refuse(folder: Path, overwrite: bool) -> None:
    """Refuse a folder that can't or mustn't be written, before any work is done.

    Raises
    ------
    GleyError
        When it exists and `overwrite` isn't set, isn't one of ours, is a file, or its parent can't be written.
    """
    if folder.is_file():
        message = f"{folder} is a file."
        raise GleyError(message, "Name a folder with --out.")
    if folder.is_dir() and any(folder.iterdir()):
        if not (folder / STAMP).is_file():
            message = f"{folder} holds other files and no {STAMP}: it isn't the result of a run; nothing was changed."
            raise GleyError(message, "Name another folder with --out.")
        if not overwrite:
            message = f"{folder} holds the result of an earlier run; nothing was changed."
            raise GleyError(message, "Name another folder with --out, or give --overwrite to replace it.")
    parent = folder.parent
    if not parent.is_dir():
        message = f"{parent} isn't a folder."
        raise GleyError(message, "Make it first, or name another place with --out.")
    if not os.access(parent, os.W_OK):
        message = f"{parent} can't be written."
        raise GleyError(message, "Name another place with --out.")


def build(folder: Path, overwrite: bool, fill: Callable[[Path], None]) -> list[Path]:
    """Fill a new folder and put it in place; on any fault the old state stays.

    Parameters
    ----------
    folder : Path
        Where it shall stand.
    overwrite : bool
        Replace the result of an earlier run.
    fill : callable
        Writes all files into the folder it is given.

    Returns
    -------
    list of Path
        The files, sorted.
    """
    restore(folder)
    refuse(folder, overwrite)
    working = Path(tempfile.mkdtemp(prefix=f".{folder.name}.", dir=folder.parent))
    try:
        working.chmod(0o755)
        fill(working)
        _swap(working, folder)
    except OSError as error:
        message = f"{folder}: can't be written ({error.strerror or error})."
        raise GleyError(message, "Check space and permissions; nothing was changed.") from None
    finally:
        shutil.rmtree(working, ignore_errors=True)
    return sorted(path for path in folder.rglob("*") if path.is_file())


def _swap(working: Path, folder: Path) -> None:
    """Old → .previous, new → its place, then the old one goes."""
    old = previous(folder)
    if folder.exists():
        shutil.rmtree(old, ignore_errors=True)
        os.replace(folder, old)
    try:
        os.replace(working, folder)
    except OSError:
        restore(folder)
        raise
    shutil.rmtree(old, ignore_errors=True)
