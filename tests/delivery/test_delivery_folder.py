"""A folder stands whole or not at all: refusals, replacement, faults half way, a run killed between two renames."""

import json
import os
from pathlib import Path

import pytest

from gley.delivery import refuse, restore
from gley.delivery.folder import build, previous
from gley.errors import GleyError


def fill(text):
    def write(folder, restored):
        (folder / "run.json").write_text(text)
        (folder / "charts").mkdir()
        (folder / "charts/As.svg").write_text(text)

    return write


def state(folder):
    return {path.relative_to(folder).as_posix(): path.read_bytes() for path in folder.rglob("*") if path.is_file()}


def test_new_folder_lists_its_files(tmp_path):
    files = build(tmp_path / "a", False, fill("one"))
    assert [path.relative_to(tmp_path).as_posix() for path in files] == ["a/charts/As.svg", "a/run.json"]
    assert [path.name for path in tmp_path.iterdir()] == ["a"]


def test_result_of_an_earlier_run_is_refused_and_stays(tmp_path):
    build(tmp_path / "a", False, fill("one"))
    before = state(tmp_path)
    with pytest.raises(GleyError, match=r"earlier run; nothing was changed.*--overwrite"):
        build(tmp_path / "a", False, fill("two"))
    assert state(tmp_path) == before


def test_overwrite_replaces_and_leaves_nothing_behind(tmp_path):
    build(tmp_path / "a", False, fill("one"))
    build(tmp_path / "a", True, fill("two"))
    assert (tmp_path / "a/run.json").read_text() == "two"
    assert [path.name for path in tmp_path.iterdir()] == ["a"]


def test_folder_with_other_files_is_never_replaced(tmp_path):
    (tmp_path / "photos").mkdir()
    (tmp_path / "photos/well.jpg").write_text("x")
    with pytest.raises(GleyError, match=r"holds other files and no run\.json"):
        build(tmp_path / "photos", True, fill("two"))
    assert (tmp_path / "photos/well.jpg").read_text() == "x"


def test_fault_half_way_changes_nothing(tmp_path):
    build(tmp_path / "a", False, fill("one"))
    before = state(tmp_path)

    def broken(folder, restored):
        (folder / "run.json").write_text("two")
        raise OSError(28, "No space left on device")

    with pytest.raises(GleyError, match=r"can't be written \(No space left on device\).*nothing was changed"):
        build(tmp_path / "a", True, broken)
    assert state(tmp_path) == before


def test_any_other_fault_leaves_no_working_folder(tmp_path):
    def broken(folder, restored):
        raise RuntimeError("drawing failed")

    with pytest.raises(RuntimeError, match="drawing failed"):
        build(tmp_path / "a", False, broken)
    assert list(tmp_path.iterdir()) == []


def test_run_killed_between_the_renames_is_mended_by_the_next(tmp_path):
    build(tmp_path / "a", False, fill("one"))
    (tmp_path / "a").rename(previous(tmp_path / "a"))
    with pytest.raises(GleyError, match=r"stopped while it replaced.*put back.*earlier run; nothing was changed"):
        build(tmp_path / "a", False, fill("two"))
    assert (tmp_path / "a/run.json").read_text() == "one"
    assert not previous(tmp_path / "a").exists()


def test_empty_folder_is_taken(tmp_path):
    (tmp_path / "a").mkdir()
    assert build(tmp_path / "a", False, fill("one"))


def test_file_in_the_way_and_missing_parent_are_refused(tmp_path):
    (tmp_path / "file").write_text("x")
    with pytest.raises(GleyError, match="is a file"):
        refuse(tmp_path / "file", True)
    with pytest.raises(GleyError, match="isn't a folder"):
        refuse(tmp_path / "nowhere/a", False)


def test_folder_put_back_is_told_to_whoever_fills_the_new_one(tmp_path):
    build(tmp_path / "a", False, fill("one"))
    (tmp_path / "a").rename(previous(tmp_path / "a"))
    told = []
    build(tmp_path / "a", True, lambda folder, restored: (told.append(restored), fill("two")(folder, restored)))
    build(tmp_path / "a", True, lambda folder, restored: (told.append(restored), fill("two")(folder, restored)))
    assert told == [True, False]


def test_folder_of_the_user_called_previous_is_left_alone(tmp_path):
    (tmp_path / "a.previous").mkdir()
    (tmp_path / "a.previous/notes.txt").write_text("mine")
    assert not restore(tmp_path / "a")
    build(tmp_path / "a", False, fill("one"))
    assert (tmp_path / "a.previous/notes.txt").read_text() == "mine"
    with pytest.raises(GleyError, match=r"a\.previous beside .* is in the way.*nothing was changed"):
        build(tmp_path / "a", True, fill("two"))
    (tmp_path / "b").mkdir()
    (tmp_path / "b.previous").mkdir()
    with pytest.raises(GleyError, match=r"b\.previous beside .* is in the way"):
        build(tmp_path / "b", False, fill("two"))
    assert (tmp_path / "a.previous/notes.txt").read_text() == "mine"
    assert (tmp_path / "a/run.json").read_text() == "one"


def test_killed_after_the_renames_leaves_only_an_old_folder_that_the_next_run_removes(tmp_path):
    build(tmp_path / "a", False, fill("two"))
    build(tmp_path / "a.previous", False, fill("one"))
    assert not restore(tmp_path / "a")
    build(tmp_path / "a", True, fill("three"))
    assert [path.name for path in tmp_path.iterdir()] == ["a"]
    assert (tmp_path / "a/run.json").read_text() == "three"


def test_stop_by_the_user_between_the_renames_puts_the_old_one_back(tmp_path, monkeypatch):
    build(tmp_path / "a", False, fill("one"))
    before, real = state(tmp_path), os.replace

    def stopped(source, target):
        if Path(source).name.startswith(".a."):
            raise KeyboardInterrupt("pressed")
        real(source, target)

    monkeypatch.setattr(os, "replace", stopped)
    with pytest.raises(KeyboardInterrupt, match="pressed"):
        build(tmp_path / "a", True, fill("two"))
    assert state(tmp_path) == before


def test_files_that_no_run_wrote_are_never_deleted(tmp_path):
    listed = json.dumps({"files": ["charts/As.svg", "run.json"]})
    build(tmp_path / "a", False, fill(listed))
    (tmp_path / "a/.DS_Store").write_text("")
    build(tmp_path / "a", True, fill(listed))
    (tmp_path / "a/charts/my remarks.docx").write_text("mine")
    with pytest.raises(GleyError, match=r"no run wrote \(charts/my remarks\.docx\); nothing was changed"):
        build(tmp_path / "a", True, fill("two"))
    assert (tmp_path / "a/charts/my remarks.docx").read_text() == "mine"


def test_working_folder_is_refused(tmp_path, monkeypatch):
    (tmp_path / "in").mkdir()
    monkeypatch.chdir(tmp_path / "in")
    for name in (".", "..", "/"):
        with pytest.raises(GleyError, match=r"the folder you are in, or above it"):
            build(Path(name), True, fill("one"))


def test_link_to_a_folder_is_followed(tmp_path):
    build(tmp_path / "real", False, fill("one"))
    (tmp_path / "link").symlink_to(tmp_path / "real", target_is_directory=True)
    files = build(tmp_path / "link", True, fill("two"))
    assert (tmp_path / "real/run.json").read_text() == "two"
    assert (tmp_path / "link").is_symlink()
    assert files[-1] == tmp_path / "link/run.json"


def test_unwritable_parent_is_refused(tmp_path, monkeypatch):
    monkeypatch.setattr(os, "access", lambda path, mode: False)
    with pytest.raises(GleyError, match=r"can't be written\. Name another place"):
        refuse(tmp_path / "a", False)
