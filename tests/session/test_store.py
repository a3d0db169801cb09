"""A folder holds the new set of files, or the old one."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from tauworkbench.errors import InputError
from tauworkbench.session.store import check_folder, default_folder, write_files, write_text


def names(folder: Path) -> list[str]:
    return sorted(p.name for p in folder.iterdir())


def test_files_are_written_and_nothing_else(tmp_path):
    write_files(tmp_path / "a" / "b", {"one": "1", "two": iter(["2", "2"])})
    assert names(tmp_path / "a" / "b") == ["one", "two"]
    assert (tmp_path / "a" / "b" / "two").read_text() == "22"


def test_an_older_result_is_replaced_and_other_files_stay(tmp_path):
    (tmp_path / "one").write_text("old")
    (tmp_path / "mine").write_text("mine")
    write_files(tmp_path, {"one": "new"})
    assert (tmp_path / "one").read_text() == "new"
    assert names(tmp_path) == ["mine", "one"]


def broken_off():
    yield "half"
    raise KeyboardInterrupt


def test_a_broken_writing_leaves_the_older_result(tmp_path):
    (tmp_path / "one").write_text("old")
    with pytest.raises(KeyboardInterrupt):
        write_files(tmp_path, {"one": "new", "two": broken_off()})
    assert names(tmp_path) == ["one"]
    assert (tmp_path / "one").read_text() == "old"


def test_a_broken_writing_makes_no_folder(tmp_path):
    with pytest.raises(KeyboardInterrupt):
        write_files(tmp_path / "a" / "b", {"two": broken_off()})
    assert names(tmp_path) == []


@pytest.mark.parametrize("fails_at", range(1, 5))
def test_a_failed_rename_puts_the_old_files_back(tmp_path, monkeypatch, fails_at):
    for name in ("one", "two"):
        (tmp_path / name).write_text("old")
    calls = 0
    replace = Path.replace

    def failing(self, target):
        nonlocal calls
        calls += 1
        if calls == fails_at:
            raise OSError(28, "No space left on device")
        return replace(self, target)

    monkeypatch.setattr(Path, "replace", failing)
    with pytest.raises(InputError, match="No space left"):
        write_files(tmp_path, {"one": "new", "two": "new"})
    assert [(tmp_path / n).read_text() for n in ("one", "two")] == ["old", "old"]
    assert names(tmp_path) == ["one", "two"]


def test_a_file_in_the_folders_place_is_refused(tmp_path):
    (tmp_path / "run").write_text("mine")
    for place in (tmp_path / "run", tmp_path / "run" / "deeper"):
        with pytest.raises(InputError, match="is a file"):
            check_folder(place)
    assert (tmp_path / "run").read_text() == "mine"


@pytest.mark.skipif(os.geteuid() == 0, reason="root may write anywhere")
def test_a_folder_without_permission_is_refused(tmp_path):
    tmp_path.chmod(0o500)
    with pytest.raises(InputError, match="may not be written"):
        check_folder(tmp_path / "out")


@pytest.mark.parametrize(
    ("source", "folder"),
    [("a/run.toml", "a/run"), ("run", "run_result"), ("a.b/run.v2.toml", "a.b/run.v2")],
)
def test_the_default_folder_is_beside_the_input_and_named_after_it(source, folder):
    assert default_folder(source) == Path(folder)


def test_text_is_written_by_rename_and_keeps_its_permissions(tmp_path):
    file = tmp_path / "run.toml"
    file.write_text("old")
    file.chmod(0o640)
    write_text(file, "new")
    assert file.read_text() == "new"
    assert file.stat().st_mode & 0o777 == 0o640
    assert names(tmp_path) == ["run.toml"]


def test_text_into_a_missing_folder_is_refused(tmp_path):
    with pytest.raises(InputError, match="can't be written"):
        write_text(tmp_path / "none" / "run.toml", "new")
