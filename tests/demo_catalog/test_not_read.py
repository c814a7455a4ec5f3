"""The program never looks at the truth."""

from __future__ import annotations

import re
import shutil
from pathlib import Path

import numpy as np

from planner.sales.load import load, request_from_folder
from tests.demo_catalog.test_files import FOLDER

PLANNER = FOLDER.parent / "planner"


def named_in(sources: list[Path], pattern: str) -> list[str]:
    return [path.name for path in sources if re.search(pattern, path.read_text("utf-8"), re.IGNORECASE)]


def test_no_code_of_the_program_names_it() -> None:
    sources = list(PLANNER.rglob("*.py"))
    assert len(sources) > 50
    assert named_in(sources, r"\btruth\b") == []
    assert named_in(sources, r"(from|import) demo_catalog") == []


def test_loading_without_it_gives_the_same(tmp_path: Path) -> None:
    bare = tmp_path / "bare"
    shutil.copytree(FOLDER, bare, ignore=shutil.ignore_patterns("truth", "*.py", "generator", "__pycache__"))
    assert not (bare / "truth").exists()
    with_it, without = load(request_from_folder(FOLDER)), load(request_from_folder(bare))
    assert with_it.catalogue == without.catalogue
    np.testing.assert_array_equal(with_it.panel.units, without.panel.units)
    np.testing.assert_array_equal(with_it.panel.on_sale, without.panel.on_sale)
    np.testing.assert_array_equal(with_it.base.units, without.base.units)
    np.testing.assert_array_equal(with_it.base.margin, without.base.margin)
