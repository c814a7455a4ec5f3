"""Files for the user appear whole or not at all."""

from __future__ import annotations

from pathlib import Path

import pytest

from planner.base.errors import CallError
from planner.base.target_file import check_target, replacing


def test_a_file_is_replaced_in_one_step(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text("old", encoding="utf-8")
    with replacing(path, (".csv",)) as part:
        part.write_text("new", encoding="utf-8")
        assert path.read_text(encoding="utf-8") == "old"
        assert part.parent == tmp_path
        assert part.suffix == ".csv"
    assert path.read_text(encoding="utf-8") == "new"
    assert [p.name for p in tmp_path.iterdir()] == ["a.csv"]


def test_a_failure_leaves_the_old_file(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text("old", encoding="utf-8")

    def write_half() -> None:
        with replacing(path) as part:
            part.write_text("half", encoding="utf-8")
            raise ZeroDivisionError

    with pytest.raises(ZeroDivisionError):
        write_half()
    assert path.read_text(encoding="utf-8") == "old"
    assert [p.name for p in tmp_path.iterdir()] == ["a.csv"]


def test_a_full_disk_is_said(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"

    def write() -> None:
        with replacing(path):
            raise OSError(28, "No space left on device")

    with pytest.raises(CallError, match="No space left") as caught:
        write()
    assert caught.value.place == str(path)
    assert list(tmp_path.iterdir()) == []


def test_targets_that_cannot_be_written(tmp_path: Path) -> None:
    (tmp_path / "folder.csv").mkdir()
    locked = tmp_path / "locked.csv"
    locked.write_text("old", encoding="utf-8")
    locked.chmod(0o444)
    for name, words in (
        ("a.xlsx", ".xlsx"),
        ("none/a.csv", "no folder"),
        ("folder.csv", "folder"),
        ("locked.csv", "read-only"),
    ):
        with pytest.raises(CallError, match=words) as caught:
            check_target(tmp_path / name, (".csv", ".txt"))
        assert caught.value.place == str(tmp_path / name)
        assert caught.value.remedy
    check_target(tmp_path / "A.CSV", (".csv",))
    check_target(tmp_path / "anything")
