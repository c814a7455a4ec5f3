"""Killed while saving, the file holds one whole state; two copies of the program do not share a file."""

from __future__ import annotations

import os
import random
import subprocess
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest

from planner.base.errors import CallError, PlanFileError
from planner.planfile.lock import PlanLock
from planner.planfile.store import load, save
from tests.planfile.same import same
from tests.planfile.saver import versions

ROOT = Path(__file__).resolve().parents[2]


@contextmanager
def program(what: str, path: Path) -> Iterator[subprocess.Popen[str]]:
    """The saver, after it said that it is ready; killed at the end."""
    child = subprocess.Popen(
        [sys.executable, "-m", "tests.planfile.saver", what, str(path)],
        cwd=ROOT,
        stdout=subprocess.PIPE,
        text=True,
    )
    assert child.stdout is not None
    try:
        assert child.stdout.readline() == "ready\n"
        yield child
    finally:
        child.kill()
        child.wait()
        child.stdout.close()


def kill_often(folder: Path, kills: int, fresh: bool) -> dict[str, int]:
    """Kill savers at random moments; what was found afterwards is counted."""
    rng = random.Random(5)
    path = folder / "review.rangewright"
    both = versions()
    found = {"old": 0, "new": 0, "journal": 0, "none": 0}
    for _round in range(kills):
        if fresh:
            path.unlink(missing_ok=True)
        elif not path.exists():
            save(path, both[0])
        with program("save", path) as child:
            time.sleep(rng.uniform(0.0, 0.08))
            child.kill()
            child.wait()
        found["journal"] += path.with_name(path.name + "-journal").exists()
        if fresh and not path.exists():
            found["none"] += 1
            with pytest.raises(PlanFileError, match="cannot be opened"):
                load(path)
            continue
        contents = load(path)
        version = contents.settings["version"]
        assert version in (1, 2)
        assert same(contents, both[int(str(version)) - 1])
        found["old" if version == 1 else "new"] += 1
        # What was rolled back can be saved over.
        save(path, both[0])
        assert same(load(path), both[0])
    return found


def test_kill_while_saving(tmp_path: Path) -> None:
    found = kill_often(tmp_path, 4, fresh=False)
    assert found["old"] + found["new"] == 4


def test_kill_while_saving_for_the_first_time(tmp_path: Path) -> None:
    found = kill_often(tmp_path, 3, fresh=True)
    assert found["old"] + found["new"] + found["none"] == 3


@pytest.mark.slow
@pytest.mark.parametrize("fresh", [False, True])
def test_a_hundred_kills(tmp_path: Path, fresh: bool) -> None:
    found = kill_often(tmp_path, 100, fresh)
    print(f"\n100 kills, {'new' if fresh else 'existing'} file: {found}")
    assert found["old"] + found["new"] + found["none"] == 100
    if not fresh:
        # Else no kill fell into a save and the test has shown nothing.
        assert found["journal"] > 0


def test_a_killed_transaction_is_rolled_back(tmp_path: Path) -> None:
    """The moment between the first changed page and the commit, without luck."""
    path = tmp_path / "review.rangewright"
    both = versions()
    save(path, both[0])
    code = (
        "import os, sys, planner.planfile.database as d\n"
        "from pathlib import Path\n"
        "from planner.planfile.store import save\n"
        "from tests.planfile.saver import versions\n"
        "work = d._plan_of_saving\n"
        "def killed(connection, texts, blobs):\n"
        "    connection.execute('PRAGMA cache_size = 2')\n"
        "    work(connection, texts, blobs)\n"
        "    os.kill(os.getpid(), 9)\n"
        "d._plan_of_saving = killed\n"
        "save(Path(sys.argv[1]), versions()[1])\n"
    )
    done = subprocess.run([sys.executable, "-c", code, str(path)], cwd=ROOT, check=False)
    assert done.returncode == -9
    assert path.with_name(path.name + "-journal").stat().st_size > 0
    assert same(load(path), both[0])


def test_another_copy_of_the_program_is_noticed(tmp_path: Path) -> None:
    path = tmp_path / "review.rangewright"
    with program("hold", path) as child:
        with pytest.raises(CallError, match="open in another copy") as caught:
            PlanLock(path)
        assert caught.value.place == str(path)
        assert "Close it there" in caught.value.remedy
        child.kill()
        child.wait()
        # The lock died with its owner, although its file is still there.
        with PlanLock(path) as lock:
            assert lock.held
    assert list(tmp_path.iterdir()) == []


def test_the_same_program_does_not_open_a_plan_twice(tmp_path: Path) -> None:
    path = tmp_path / "review.rangewright"
    lock = PlanLock(path)
    with pytest.raises(CallError, match="another copy"):
        PlanLock(path)
    with PlanLock(tmp_path / "other.rangewright") as other:
        assert other.held
    lock.release()
    lock.release()
    assert not lock.held
    with PlanLock(path) as again:
        assert again.held
        again.acquire()
    assert list(tmp_path.iterdir()) == []


def test_a_lock_file_without_owner_is_taken_over(tmp_path: Path) -> None:
    path = tmp_path / "review.rangewright"
    (tmp_path / ".review.rangewright.lock").write_bytes(b"left behind")
    with PlanLock(path) as lock:
        assert lock.held


def test_a_lock_needs_the_folder(tmp_path: Path) -> None:
    with pytest.raises(CallError, match="no folder"):
        PlanLock(tmp_path / "none" / "a.rangewright")


def test_a_lock_removed_while_opening_is_tried_again(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = tmp_path / "review.rangewright"
    opened: list[int] = []
    really = os.open

    def open_then_lose(name: Path, flags: int, mode: int = 0o777) -> int:
        file = really(name, flags, mode)
        if not opened:
            Path(name).unlink()
        opened.append(file)
        return file

    monkeypatch.setattr("planner.planfile.lock.os.open", open_then_lose)
    with PlanLock(path) as lock:
        assert lock.held
        assert len(opened) == 2
        assert lock.path.exists()
