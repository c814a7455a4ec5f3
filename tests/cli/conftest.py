"""One small plan file, loaded and fitted once through the command line, and a way to call it."""

from __future__ import annotations

import io
import json
import shutil
from collections.abc import Callable
from contextlib import redirect_stderr, redirect_stdout
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest

from planner.cli.main import main
from tests.review.small import write_folder


@dataclass(frozen=True)
class Done:
    """Exit code, words before the last line, the last line read as JSON, standard error."""

    code: int
    words: str
    answer: dict[str, Any]
    errors: str


def no_such_number(text: str) -> None:
    raise AssertionError(f"{text} is not JSON")


def call(*arguments: object) -> Done:
    """Run one command inside this process."""
    out, err = io.StringIO(), io.StringIO()
    with redirect_stdout(out), redirect_stderr(err):
        try:
            code = main([str(argument) for argument in arguments])
        except SystemExit as end:
            code = int(str(end.code))
    lines = out.getvalue().splitlines()
    answer = json.loads(lines[-1], parse_constant=no_such_number)
    assert isinstance(answer, dict)
    return Done(code, "\n".join(lines[:-1]), answer, err.getvalue())


@pytest.fixture(scope="session")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The small category's files."""
    return write_folder(tmp_path_factory.mktemp("small"))


def load_arguments(folder: Path) -> list[object]:
    """The load command for every table of the folder, without --plan."""
    names = ("sales", "items", "stores", "shoppers", "ranges", "offers")
    return ["load", *(part for name in names for part in (f"--{name}", folder / f"{name}.csv"))]


@pytest.fixture(scope="session")
def fitted_plan(folder: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Loaded and fitted; not to be written into."""
    path = tmp_path_factory.mktemp("plan") / "p.rangewright"
    assert call(*load_arguments(folder), "--plan", path).code == 0
    assert call("fit", "--plan", path, "--draws", 40).code == 0
    return path


@pytest.fixture
def plan(fitted_plan: Path, tmp_path: Path) -> Path:
    """A copy to work on."""
    return Path(shutil.copy(fitted_plan, tmp_path / "p.rangewright"))


@pytest.fixture
def run() -> Callable[..., Done]:
    return call
