"""The output folder: refused before a run, filled whole, never with leftovers."""

from __future__ import annotations

from pathlib import Path

import pytest

from flowemu.errors import RunError
from flowemu.output.folder import check_writable, prepare_folder, staged, write_text


def listed(folder: Path) -> list[str]:
    return sorted(path.relative_to(folder).as_posix() for path in folder.rglob("*") if path.is_file())


def test_folder_under_a_file_is_refused_and_nothing_made(tmp_path) -> None:
    (tmp_path / "taken").write_text("x")
    with pytest.raises(RunError, match=r"cannot write to .*taken/out: .*taken is not a folder"):
        check_writable(tmp_path / "taken" / "out")
    assert listed(tmp_path) == ["taken"]


def test_folder_in_a_place_that_takes_no_files_is_refused() -> None:
    with pytest.raises(RunError, match="cannot write to /proc/out"):
        check_writable(Path("/proc/out"))


def test_default_folder_is_named_by_the_flow_file(tmp_path, monkeypatch) -> None:
    monkeypatch.chdir(tmp_path)
    assert prepare_folder(None, Path("flows/rotor.yaml")) == Path("outputs/rotor")
    assert prepare_folder("there", Path("flows/rotor.yaml")) == Path("there")
    assert listed(tmp_path) == []


def test_failed_run_leaves_the_folder_as_it_was(tmp_path) -> None:
    folder = tmp_path / "out"
    with staged(folder, "run") as staging:
        (staging / "result.json").write_text("old")
    before = listed(tmp_path)
    with pytest.raises(KeyboardInterrupt), staged(folder, "run") as staging:
        (staging / "result.json").write_text("half")
        raise KeyboardInterrupt
    assert listed(tmp_path) == before
    assert (folder / "result.json").read_text() == "old"


def test_second_run_removes_its_own_old_files_and_no_others(tmp_path) -> None:
    folder = tmp_path / "out"
    with staged(folder, "run") as staging:
        (staging / "figures").mkdir()
        (staging / "figures" / "step09.svg").write_text("old")
        (staging / "result.json").write_text("old")
    with staged(folder, "mesh") as staging:
        (staging / "part.stl").write_text("mesh")
    (folder / "notes.txt").write_text("mine")
    with staged(folder, "run") as staging:
        (staging / "result.json").write_text("new")
    assert listed(folder) == [".flowemu.json", "notes.txt", "part.stl", "result.json"]
    assert not (folder / "figures").exists()


def test_list_of_files_that_points_outside_removes_nothing_there(tmp_path) -> None:
    folder = tmp_path / "out"
    folder.mkdir()
    (tmp_path / "precious").write_text("x")
    (folder / ".flowemu.json").write_text('{"run": ["../precious"]}')
    with staged(folder, "run") as staging:
        (staging / "result.json").write_text("new")
    assert (tmp_path / "precious").exists()


def test_text_is_replaced_in_one_move(tmp_path) -> None:
    write_text(tmp_path / "a.txt", "one")
    write_text(tmp_path / "a.txt", "two")
    assert listed(tmp_path) == ["a.txt"]
    assert (tmp_path / "a.txt").read_text() == "two"
