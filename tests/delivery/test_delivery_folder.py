"""A folder stands whole or not at all: refusals, replacement, faults half way, a run killed between two renames."""

import pytest

from gley.delivery import refuse
from gley.delivery.folder import build, previous
from gley.errors import GleyError


def fill(text):
    def write(folder):
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

    def broken(folder):
        (folder / "run.json").write_text("two")
        raise OSError(28, "No space left on device")

    with pytest.raises(GleyError, match=r"can't be written \(No space left on device\).*nothing was changed"):
        build(tmp_path / "a", True, broken)
    assert state(tmp_path) == before


def test_any_other_fault_leaves_no_working_folder(tmp_path):
    def broken(folder):
        raise RuntimeError("drawing failed")

    with pytest.raises(RuntimeError, match="drawing failed"):
        build(tmp_path / "a", False, broken)
    assert list(tmp_path.iterdir()) == []


def test_run_killed_between_the_renames_is_mended_by_the_next(tmp_path):
    build(tmp_path / "a", False, fill("one"))
    (tmp_path / "a").rename(previous(tmp_path / "a"))
    with pytest.raises(GleyError, match="earlier run"):
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
