"""load and fit: what they store, what they answer, what they refuse."""

from __future__ import annotations

import csv
from pathlib import Path

import pytest

from planner.review.review import RangeReview
from tests.cli.conftest import call, load_arguments


def test_load_reconciles_and_stores(folder: Path, tmp_path: Path) -> None:
    plan, aside = tmp_path / "p.rangewright", tmp_path / "aside.csv"
    sales = tmp_path / "sales.csv"
    lines = (folder / "sales.csv").read_text(encoding="utf-8").splitlines()
    lines += [lines[1], "100,2025-09-01,9999,3,4.50"]
    sales.write_text("\n".join(lines) + "\n", encoding="utf-8")
    arguments = load_arguments(folder)
    arguments[2] = sales
    done = call(*arguments, "--plan", plan, "--set-aside", aside)
    answer = done.answer
    assert (done.code, done.errors) == (0, "")
    assert answer["rows"] == len(lines) - 1
    assert answer["rows_used"] == answer["rows"] - 2
    assert answer["checks"]["duplicate_row"] == 1
    assert answer["set_aside"]["unknown_item"] == {"rows": 1, "money": 4.5}
    apart = sum(reason["money"] for reason in answer["set_aside"].values())
    assert answer["money_set_aside"] == pytest.approx(apart, abs=1e-9)
    assert answer["money_read"] == pytest.approx(answer["money_used"] + apart, abs=0.001)
    money = sum(round(100 * float(line.rsplit(",", 1)[1])) for line in lines[1:])
    assert round(100 * answer["money_read"]) == money
    sizes = ("weeks", "stores", "items", "offers", "clusters", "segments")
    assert [answer[key] for key in sizes] == [
        30, 8, 10, 1, ["North", "South"], ["Bean soup", "Fish soup", "Plain soup"],
    ]  # fmt: skip
    assert answer["events"] > 0
    assert "Read" in done.words
    rows = list(csv.DictReader(aside.read_text(encoding="utf-8").splitlines()))
    assert sorted(int(row["row"]) for row in rows) == [len(lines) - 1, len(lines)]
    review = RangeReview()
    review.open(plan)
    assert review.need_loaded().report.rows_read == answer["rows"]
    review.close()


def test_load_takes_matches_and_segments(folder: Path, tmp_path: Path) -> None:
    sales = tmp_path / "sales.csv"
    text = (folder / "sales.csv").read_text(encoding="utf-8")
    sales.write_text(text.replace("units", "zz_a").replace("sales_value", "zz_b"), encoding="utf-8")
    arguments = load_arguments(folder)
    arguments[2] = sales
    plan = tmp_path / "p.rangewright"
    assert call(*arguments, "--plan", plan).code == 3
    assert not plan.exists()
    extra = ("--match", "sales.units=zz_a", "sales.revenue=zz_b", "--segment-by", "brand,segment")
    done = call(*arguments, "--plan", plan, *extra)
    assert done.code == 0, done.errors
    assert "Quellin / Bean soup" in done.answer["segments"]
    twice = ("--match", "sales.units=zz_a", "--match", "sales.revenue=zz_b")
    assert call(*arguments, "--plan", plan, *twice).code == 0


def test_load_replaces_the_plan_whole_or_not_at_all(folder: Path, plan: Path, tmp_path: Path) -> None:
    before = plan.read_bytes()
    broken = tmp_path / "broken.csv"
    broken.write_text("store;nothing\n1;2\n", encoding="utf-8")
    arguments = load_arguments(folder)
    done = call("load", "--sales", broken, "--items", folder / "items.csv", "--plan", plan)
    assert done.code == 3
    assert str(broken.name) in done.errors
    assert plan.read_bytes() == before
    assert call(*arguments, "--plan", plan).code == 0
    review = RangeReview()
    review.open(plan)
    assert review.fitted is None
    review.close()


@pytest.mark.parametrize(
    ("extra", "code"),
    [
        (("--match", "units=zz"), 2),
        (("--match", "poems.units=zz"), 2),
        (("--match", "sales.units=zz"), 3),
        (("--segment-by", "colour"), 3),
        (("--set-aside", "aside.xlsx"), 2),
        (("--costs", "missing.csv"), 3),
        (("--poem", "x"), 2),
        (("--segment", "brand"), 2),
    ],
)
def test_what_load_refuses(folder: Path, tmp_path: Path, extra: tuple[str, str], code: int) -> None:
    plan = tmp_path / "p.rangewright"
    done = call(*load_arguments(folder), "--plan", plan, *extra)
    assert done.code == code
    assert done.answer["exit"] == code
    assert done.answer["error"]
    assert done.errors
    assert not plan.exists()


def test_a_plan_in_a_missing_folder_is_refused_before_the_work(folder: Path, tmp_path: Path) -> None:
    done = call(*load_arguments(folder), "--plan", tmp_path / "none" / "p.rangewright")
    assert done.code == 2
    assert "folder" in done.errors


def test_fit_answers_with_parameters_and_stores_the_fit(plan: Path) -> None:
    done = call("fit", "--plan", plan, "--draws", 40, "--seed", 3)
    answer = done.answer
    assert (done.code, done.errors) == (0, "")
    assert (answer["model"], answer["converged"], answer["with_shoppers"]) == ("nested", True, True)
    assert answer["log_likelihood"] < 0.0
    assert answer["seconds"] > 0.0
    names = {parameter["name"] for parameter in answer["parameters"]}
    assert "category dissimilarity" in names
    assert all(parameter["standard_error"] >= 0.0 for parameter in answer["parameters"])
    assert "stays in the category" in done.words
    review = RangeReview()
    review.open(plan)
    assert review.need_fitted().log_likelihood == answer["log_likelihood"]
    assert review.need_fitted().draws.n_draws == 40
    review.close()


def test_the_plain_model(plan: Path) -> None:
    done = call("fit", "--plan", plan, "--model", "plain", "--draws", 40)
    assert (done.code, done.answer["model"]) == (0, "plain")
    assert {segment["ratio"] for segment in done.answer["segments"]} == {1.0}


def test_fit_with_other_segments_keeps_the_kept_plans(plan: Path) -> None:
    assert call("recommend", "--plan", plan, "--changes", 1).code == 0
    done = call("fit", "--plan", plan, "--segment-by", "brand", "--draws", 40)
    assert done.code == 0, done.errors
    assert done.answer["segments"][0]["segment"] == "Marlind"
    review = RangeReview()
    review.open(plan)
    assert review.need_loaded().request.segment_by == ("brand",)
    assert review.plan("best plan").outcome is None
    review.close()


def test_same_seed_same_fit(plan: Path) -> None:
    first = call("fit", "--plan", plan, "--draws", 20, "--seed", 5).answer
    again = call("fit", "--plan", plan, "--draws", 20, "--seed", 5).answer
    assert first["parameters"] == again["parameters"]


@pytest.mark.parametrize(
    "extra",
    [
        ("--model", "tastes"),
        ("--draws", "5"),
        ("--draws", "many"),
        ("--seed", "-1"),
        ("--mod", "plain"),
    ],
)
def test_what_fit_refuses(plan: Path, extra: tuple[str, str]) -> None:
    before = plan.read_bytes()
    assert call("fit", "--plan", plan, *extra).code == 2
    assert plan.read_bytes() == before
