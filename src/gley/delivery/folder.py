"""A folder written whole or not at all: built beside its place, then renamed; the old one stays till then."""

import json
import os
import shutil
import tempfile
from collections.abc import Callable
from pathlib import Path

from gley.errors import GleyError
from gley.findings import some

STAMP = "run.json"
"""The file that marks a folder as one of ours; its list `files` says which files in it are."""

_SYSTEM_FILES = {".DS_Store", "Thumbs.db", "desktop.ini"}
_SHOWN_FILES = 4


def previous(folder: Path) -> Path:
    """Where the old folder waits while the new one takes its place."""
    return folder.with_name(folder.name + ".previous")


def restore(folder: Path) -> bool:
    """Put the old folder back when an earlier run was stopped between the two renames; True when it did."""
    folder = folder.resolve()
    if not folder.name:
        return False
    old = previous(folder)
    # a folder of the user's own may bear that name: only one of ours is moved
    if folder.exists() or not (old / STAMP).is_file():
        return False
    os.replace(old, folder)
    return True


def refuse(folder: Path, overwrite: bool) -> None:
    """Refuse a folder that can't or mustn't be written, before any work is done.

    Raises
    ------
    GleyError
        When it exists and `overwrite` isn't set, isn't one of ours or holds files that aren't, is a file, is the folder
        you are in, or its parent can't be written.
    """
    real = folder.resolve()
    if real.is_file():
        message = f"{folder} is a file."
        raise GleyError(message, "Name a folder with --out.")
    if real == Path.cwd() or real in Path.cwd().parents:
        message = f"{folder} is the folder you are in, or above it: it can't be replaced as a whole."
        raise GleyError(message, "Name a new folder with --out.")
    try:
        if real.is_dir():
            _refuse_content(folder, real, overwrite)
    except OSError as error:
        message = f"{folder}: can't be read ({error.strerror})."
        raise GleyError(message, "Name another folder with --out.") from None
    parent = folder.parent if folder.name else real.parent
    if not parent.is_dir():
        message = f"{parent} isn't a folder."
        raise GleyError(message, "Make it first, or name another place with --out.")
    if not os.access(real.parent, os.W_OK):
        message = f"{parent} can't be written."
        raise GleyError(message, "Name another place with --out.")


def _refuse_content(folder: Path, real: Path, overwrite: bool) -> None:
    """Refuse what stands there, unless it is empty or may be replaced."""
    if any(real.iterdir()):
        _refuse_files(folder, real, overwrite)
    old = previous(real)
    if old.exists() and not (old / STAMP).is_file():
        message = f"{old.name} beside {folder} is in the way: the old result waits there during the exchange."
        raise GleyError(message, "Rename it, or name another folder with --out; nothing was changed.")


def _refuse_files(folder: Path, real: Path, overwrite: bool) -> None:
    if not (real / STAMP).is_file():
        message = f"{folder} holds other files and no {STAMP}: it isn't the result of a run; nothing was changed."
        raise GleyError(message, "Name another folder with --out.")
    if not overwrite:
        message = f"{folder} holds the result of an earlier run; nothing was changed."
        raise GleyError(message, "Name another folder with --out, or give --overwrite to replace it.")
    strange = _strange(real)
    if strange:
        message = f"{folder} holds files that no run wrote ({some(strange, _SHOWN_FILES)}); nothing was changed."
        raise GleyError(message, "Move them elsewhere (close programs that have a layer open), or name another folder.")


def _strange(folder: Path) -> list[str]:
    """Files in a result's folder that its stamp doesn't list; none when the stamp has no list."""
    try:
        listed = json.loads((folder / STAMP).read_text(encoding="utf-8")).get("files")
    except (ValueError, AttributeError):
        return []
    if not isinstance(listed, list):
        return []
    return [name for name in content(folder) if name not in listed and Path(name).name not in _SYSTEM_FILES]


def content(folder: Path) -> list[str]:
    """All files in a folder, by their path in it, sorted."""
    return sorted(path.relative_to(folder).as_posix() for path in folder.rglob("*") if path.is_file())


def build(folder: Path, overwrite: bool, fill: Callable[[Path, bool], None]) -> list[Path]:
    """Fill a new folder and put it in place; on any fault the old state stays.

    Parameters
    ----------
    folder : Path
        Where it shall stand.
    overwrite : bool
        Replace the result of an earlier run.
    fill : callable
        Writes all files into the folder it is given; told as well whether an old result was put back first.

    Returns
    -------
    list of Path
        The files, sorted.
    """
    restored = restore(folder)
    try:
        refuse(folder, overwrite)
    except GleyError as error:
        if restored:
            message = f"An earlier run was stopped while it replaced {folder}: the old result was put back."
            message = f"{message} {error.message}"
            raise GleyError(message, error.cure) from None
        raise
    real = folder.resolve()
    try:
        working = Path(tempfile.mkdtemp(prefix=f".{real.name}.", dir=real.parent))
        try:
            working.chmod(0o755)
            fill(working, restored)
            _swap(working, real)
        finally:
            shutil.rmtree(working, ignore_errors=True)
    except OSError as error:
        message = f"{folder}: can't be written ({error.strerror or error})."
        raise GleyError(message, "Check space and permissions; nothing was changed.") from None
    return sorted(folder / name for name in content(real))


def _swap(working: Path, folder: Path) -> None:
    """Old → .previous, new → its place, then the old one goes."""
    old = previous(folder)
    moved = folder.exists()
    if moved:
        _discard(old)
        os.replace(folder, old)
    try:
        os.replace(working, folder)
    except BaseException:  # a stop by the user too
        if moved and not folder.exists():
            os.replace(old, folder)
        raise
    if moved:
        _discard(old)


def _discard(old: Path) -> None:
    """Delete a folder that waited; renamed first, so that a half-deleted one is never taken for a result."""
    if old.is_dir():
        grave = Path(tempfile.mkdtemp(prefix=f".{old.name}.", dir=old.parent))
        os.replace(old, grave / old.name)
        shutil.rmtree(grave, ignore_errors=True)
