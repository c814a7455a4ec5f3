"""What must start fast imports nothing heavy; what is heavy comes when a job needs it."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]
HEAVY = ("pandas", "scipy", "matplotlib", "openpyxl", "pyarrow", "highspy", "PySide6")


def imported(statement: str) -> set[str]:
    """Heavy packages in memory after the statement, in a process of its own."""
    code = f"import sys\n{statement}\nprint(*(n for n in {HEAVY!r} if n in sys.modules))"
    done = subprocess.run([sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True, check=True)
    return set(done.stdout.split())


@pytest.mark.parametrize(
    "module",
    ["planner.review.review", "planner.review.effects", "planner.review.jobs", "planner.base.runner"],
)
def test_the_review_imports_nothing_heavy(module: str) -> None:
    assert imported(f"import {module}") == set()


def test_a_warm_child_has_what_jobs_need_but_no_window() -> None:
    found = imported("from planner.review import engine; list(engine.warm_up())")
    assert {"pandas", "scipy", "openpyxl", "pyarrow", "highspy"} <= found
    assert "PySide6" not in found


def test_a_warm_window_needs_no_solver_and_no_workbook() -> None:
    found = imported("from planner.review import engine; engine.warm_window()")
    assert not found & {"highspy", "openpyxl", "matplotlib", "PySide6"}
    assert "pandas" in found
