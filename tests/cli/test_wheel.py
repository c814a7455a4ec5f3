"""The program from a built wheel: the demo lies inside, the truth does not, the whole review runs."""

from __future__ import annotations

import json
import os
import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]


@pytest.fixture(scope="module")
def wheel(tmp_path_factory) -> Path:
    """The wheel, built from this checkout with the build backend of this environment."""
    target = tmp_path_factory.mktemp("wheel")
    subprocess.run(
        [sys.executable, "-m", "build", "--wheel", "--no-isolation", "--outdir", str(target), str(ROOT)],
        check=True,
        capture_output=True,
    )
    (built,) = target.glob("rangewright-*.whl")
    return built


@pytest.fixture(scope="module")
def installed(wheel, tmp_path_factory) -> Path:
    """The wheel's files in a folder of their own."""
    folder = tmp_path_factory.mktemp("installed")
    subprocess.run(
        [sys.executable, "-m", "pip", "install", "-q", "--no-deps", "--target", str(folder), str(wheel)],
        check=True,
        capture_output=True,
    )
    return folder


def run(installed: Path, cwd: Path, *arguments: str) -> subprocess.CompletedProcess[str]:
    """``rangewright`` from the installed wheel, away from the checkout."""
    environment = {**os.environ, "PYTHONPATH": str(installed)}
    return subprocess.run(
        [sys.executable, *arguments], cwd=cwd, env=environment, capture_output=True, text=True, check=False
    )


def test_the_wheel_holds_the_demo_but_not_its_truth(wheel):
    names = zipfile.ZipFile(wheel).namelist()
    assert "planner/_demo/sales.csv.gz" in names
    assert "planner/_demo/offers.csv" in names
    assert "planner/_resources/debian_libraries.txt" in names
    assert not [name for name in names if "truth" in name or "generat" in name or name.startswith("tests")]


def test_the_whole_review_runs_from_the_wheel(installed, tmp_path):
    where = run(installed, tmp_path, "-c", "import planner.base.paths as p; print(p.demo_folder())")
    demo = Path(where.stdout.strip())
    assert demo == installed / "planner" / "_demo"
    done = run(
        installed, tmp_path, "-m", "planner", "review", str(demo), "--workbook", "out.xlsx", "--seconds", "2"
    )
    assert done.returncode == 0, done.stderr
    answer = json.loads(done.stdout.strip().splitlines()[-1])
    assert (tmp_path / "out.xlsx").stat().st_size > 10_000
    assert answer["plan"]["bound"] >= answer["plan"]["value"] > answer["plan"]["today_value"]
