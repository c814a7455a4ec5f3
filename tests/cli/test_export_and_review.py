"""export and review: files written, words said."""

from __future__ import annotations

import csv
from pathlib import Path

import pytest
from openpyxl import load_workbook

from planner.planfile.lock import PlanLock
from planner.review.review import RangeReview
from tests.cli.conftest import call


def test_review_does_everything_in_one_go(folder: Path, tmp_path: Path) -> None:
    book, plan = tmp_path / "out.xlsx", tmp_path / "p.rangewright"
    done = call("review", folder, "--workbook", book, "--plan", plan, "--seconds", 5)
    answer = done.answer
    assert (done.code, done.errors) == (0, "")
    assert answer["load"]["rows"] == answer["load"]["rows_used"]
    assert answer["fit"]["converged"]
    assert answer["plan"]["bound"] >= answer["plan"]["value"]
    assert (answer["workbook"], answer["plan_file"]) == (str(book), str(plan))
    for words in ("Read", "share model", "stays in the category", "80 % interval", "gap", str(book)):
        assert words in done.words
    assert len(load_workbook(book).sheetnames) >= 6
    review = RangeReview()
    review.open(plan)
    assert review.plan("best plan").outcome is not None
    review.close()


def test_review_without_a_plan_file(folder: Path, tmp_path: Path) -> None:
    done = call("review", folder, "--workbook", tmp_path / "out.xlsx")
    assert (done.code, done.answer["plan_file"]) == (0, None)
    assert [path.name for path in tmp_path.iterdir()] == ["out.xlsx"]


@pytest.mark.parametrize(
    ("workbook", "code"), [("out.csv", 2), ("none/out.xlsx", 2)], ids=["ending", "folder"]
)
def test_review_checks_its_targets_before_the_work(
    folder: Path, tmp_path: Path, workbook: str, code: int
) -> None:
    done = call("review", folder, "--workbook", tmp_path / workbook)
    assert (done.code, done.words) == (code, "")


@pytest.mark.parametrize("name", ["", "none"], ids=["empty", "missing"])
def test_review_of_a_folder_without_data(tmp_path: Path, name: str) -> None:
    done = call("review", tmp_path / name, "--workbook", tmp_path / "out.xlsx")
    assert (done.code, done.answer["exit"]) == (3, 3)
    assert not (tmp_path / "out.xlsx").exists()


def test_export_writes_every_kind_of_the_latest_or_the_named_plan(plan: Path, tmp_path: Path) -> None:
    call("recommend", "--plan", plan, "--changes", 1, "--name", "one")
    call("recommend", "--plan", plan, "--changes", 2, "--name", "two")
    book, report, stores = (tmp_path / name for name in ("a.xlsx", "a.pdf", "a.csv"))
    done = call("export", "--plan", plan, "--workbook", book, "--report", report, "--stores-list", stores)
    assert (done.code, done.errors) == (0, "")
    assert done.answer == {"plan": "two", "files": [str(book), str(report), str(stores)]}
    assert report.read_bytes().startswith(b"%PDF")
    named = call("export", "--plan", plan, "--name", "one", "--workbook", book)
    assert named.answer["plan"] == "one"


def test_the_stores_list_tells_costs_only_when_asked(plan: Path, tmp_path: Path) -> None:
    call("recommend", "--plan", plan, "--changes", 1)
    path = tmp_path / "a.csv"

    def header() -> list[str]:
        with path.open(encoding="utf-8", newline="") as file:
            return next(csv.reader(file))

    call("export", "--plan", plan, "--stores-list", path)
    assert not {"cost", "margin"} & set(header())
    call("export", "--plan", plan, "--stores-list", path, "--with-costs")
    assert {"cost", "margin"} <= set(header())


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ((), "Nothing to write"),
        (("--workbook", "a.csv"), ".csv"),
        (("--report", "a.txt"), ".txt"),
        (("--name", "third", "--stores-list", "a.csv"), "third"),
    ],
)
def test_what_export_refuses(plan: Path, arguments: tuple[str, ...], words: str) -> None:
    call("recommend", "--plan", plan, "--changes", 1)
    done = call("export", "--plan", plan, *arguments)
    assert (done.code, done.answer["exit"]) == (2, 2)
    assert words in done.errors


def test_export_before_any_plan_is_kept(plan: Path, tmp_path: Path) -> None:
    done = call("export", "--plan", plan, "--workbook", tmp_path / "a.xlsx")
    assert done.code == 2
    assert "No plan is kept" in done.errors


@pytest.mark.parametrize(
    "command",
    [
        ("fit",),
        ("transfer", "--delist", "0012"),
        ("recommend",),
        ("export", "--workbook", "a.xlsx"),
        ("load", "--sales", "sales.csv", "--items", "items.csv"),
        ("review", ".", "--workbook", "a.xlsx"),
    ],
    ids=lambda command: command[0],
)
def test_a_plan_open_elsewhere(
    plan: Path, folder: Path, command: tuple[str, ...], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(folder)
    with PlanLock(plan):
        done = call(*command, "--plan", plan)
    assert (done.code, done.answer["exit"]) == (2, 2)
    assert "another copy" in done.errors
    assert not (folder / "a.xlsx").exists()


@pytest.mark.parametrize(
    "command",
    [("fit",), ("transfer", "--delist", "0012"), ("recommend",), ("export", "--workbook", "a.xlsx")],
    ids=lambda command: command[0],
)
def test_a_plan_that_is_none(tmp_path: Path, command: tuple[str, ...]) -> None:
    letter = tmp_path / "letter.rangewright"
    letter.write_text("Dear reader, this is no plan.", encoding="utf-8")
    for path in (letter, tmp_path / "missing.rangewright"):
        done = call(*command, "--plan", path)
        assert (done.code, done.answer["exit"]) == (3, 3)
    assert [path.name for path in tmp_path.iterdir()] == ["letter.rangewright"]


@pytest.mark.parametrize(
    "command", [("transfer", "--delist", "0012"), ("recommend",)], ids=lambda command: command[0]
)
def test_a_plan_without_a_fit(folder: Path, tmp_path: Path, command: tuple[str, ...]) -> None:
    plan = tmp_path / "p.rangewright"
    call("load", "--sales", folder / "sales.csv", "--items", folder / "items.csv", "--plan", plan)
    done = call(*command, "--plan", plan)
    assert done.code == 2
    assert "fit" in done.errors
