"""transfer and recommend: files, answers and refusals of the contract."""

from __future__ import annotations

import csv
import math
import shutil
from pathlib import Path

import pytest

from planner.review.review import RangeReview
from tests.cli.conftest import Done, call

TRANSFER = [
    "cluster", "affected_item", "units_per_week_before", "units_per_week_after", "change", "share",
    "low", "high",
]  # fmt: skip
RECOMMEND = ["cluster", "item", "today", "plan", "action", "units_per_week", "margin_per_week"]


def rows_of(path: Path, header: list[str]) -> list[dict[str, str]]:
    text = path.read_text(encoding="utf-8")
    assert text.splitlines()[0] == ",".join(header)
    return list(csv.DictReader(text.splitlines()))


def transfer(plan: Path, *arguments: object) -> tuple[Done, list[dict[str, str]]]:
    path = plan.with_name("t.csv")
    done = call("transfer", "--plan", plan, "--csv", path, *arguments)
    assert (done.code, done.errors) == (0, "")
    return done, rows_of(path, TRANSFER)


def test_transfer_writes_the_contracts_file_and_nothing_into_the_plan(plan: Path) -> None:
    before = plan.read_bytes()
    done, rows = transfer(plan, "--delist", "0012", "0031")
    assert plan.read_bytes() == before
    assert {row["cluster"] for row in rows} == {"North", "South", "ALL"}
    for cluster in ("North", "South", "ALL"):
        mine = [row for row in rows if row["cluster"] == cluster]
        codes = [row["affected_item"] for row in mine]
        assert codes[-1] == ""
        assert {"0012", "0031"} <= set(codes)
        assert len(codes) == len(set(codes))
        # What the items gain and lose and what leaves add up to nothing.
        assert math.fsum(float(row["change"]) for row in mine) == pytest.approx(0.0, abs=1e-9)
        assert float(mine[-1]["change"]) > 0.0
        assert (mine[-1]["units_per_week_before"], mine[-1]["units_per_week_after"]) == ("", "")
        for row in mine[:-1]:
            step = float(row["units_per_week_after"]) - float(row["units_per_week_before"])
            assert float(row["change"]) == pytest.approx(step, abs=1e-9)
        delisted = [row for row in mine if row["affected_item"] in ("0012", "0031")]
        assert all(float(row["units_per_week_after"]) == 0.0 for row in delisted)
        assert math.fsum(float(row["share"]) for row in delisted) == pytest.approx(-1.0)
        for row in mine:
            assert float(row["low"]) <= float(row["high"])
    total = next(row for row in rows if (row["cluster"], row["affected_item"]) == ("ALL", ""))
    assert done.answer["leaves"] == float(total["share"])
    assert (done.answer["leaves_low"], done.answer["leaves_high"]) == (
        float(total["low"]),
        float(total["high"]),
    )
    assert done.answer["units"]["change"] == pytest.approx(-float(total["change"]))
    margin = done.answer["margin"]
    assert margin["after"] - margin["before"] == pytest.approx(margin["change"])
    assert margin["low"] <= margin["change"] <= margin["high"]
    assert "Leaves the category" in done.words


def test_transfer_starts_from_today_whatever_is_in_work(plan: Path) -> None:
    first = transfer(plan, "--delist", "0012")[0].answer
    review = RangeReview()
    review.open(plan)
    review.toggle("0031")
    review.save()
    review.close()
    assert transfer(plan, "--delist", "0012")[0].answer == first


def test_transfer_in_one_cluster(plan: Path) -> None:
    done, rows = transfer(plan, "--delist", "0012", "--cluster", "North")
    assert done.answer["changes"] == 1
    south = [row for row in rows if row["cluster"] == "South"]
    assert all(float(row["change"]) == 0.0 and row["share"] == "" for row in south)


def test_transfer_of_an_item_listed_in_some_clusters_only(plan: Path) -> None:
    done, rows = transfer(plan, "--delist", "0023")
    assert done.answer["changes"] == 1
    assert all(float(row["change"]) == 0.0 for row in rows if row["cluster"] == "North")
    only_there, _rows = transfer(plan, "--delist", "0023", "--cluster", "North")
    assert only_there.answer["leaves"] is None
    assert "Nothing changes" in only_there.words


def test_transfer_lists_an_offer_where_it_is_offered(plan: Path) -> None:
    done, rows = transfer(plan, "--list", "0090")
    assert done.answer["changes"] == 1
    assert done.answer["leaves"] < 0.0
    assert "Comes into the category" in done.words
    offer = {row["cluster"]: row for row in rows if row["affected_item"] == "0090"}
    assert float(offer["North"]["units_per_week_after"]) > 0.0
    assert float(offer["South"]["units_per_week_after"]) == 0.0


def test_transfer_of_a_price(plan: Path) -> None:
    done, rows = transfer(plan, "--price", "0012=2.50", "0031=1.40", "--price", "0011=1.10")
    assert done.answer["changes"] == 0
    change = {row["affected_item"]: float(row["change"]) for row in rows if row["cluster"] == "ALL"}
    assert change["0012"] < 0.0
    assert min(change["0031"], change["0011"]) > 0.0


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ((), "Nothing to change"),
        (("--delist", "12"), "12"),
        (("--list", "0012", "77"), "77"),
        (("--price", "77=1.0"), "77"),
        (("--price", "0012"), "0012"),
        (("--price", "0012=1,20"), "0012=1,20"),
        (("--price", "0012=nan"), "nan"),
        (("--price", "0012=1", "0012=2"), "twice"),
        (("--delist", "0012", "--cluster", "West"), "West"),
        (("--delist", "0012", "--list", "0012"), "both"),
        (("--list", "0090", "--cluster", "South"), "North"),
        (("--delist", "0012", "--csv", "t.xlsx"), ".xlsx"),
    ],
)
def test_what_transfer_refuses(plan: Path, arguments: tuple[str, ...], words: str) -> None:
    done = call("transfer", "--plan", plan, *arguments)
    assert (done.code, done.answer["exit"]) == (2, 2)
    assert words in done.errors


def test_recommend_keeps_a_named_plan_and_leaves_today_alone(plan: Path) -> None:
    path = plan.with_name("r.csv")
    done = call("recommend", "--plan", plan, "--csv", path)
    answer = done.answer
    assert (done.code, done.errors) == (0, "")
    assert answer["bound"] >= answer["value"] >= answer["today_value"]
    assert answer["gap"] == pytest.approx((answer["bound"] - answer["value"]) / answer["value"], abs=1e-12)
    assert answer["status"] in ("optimal", "within target")
    assert answer["seconds"] > 0.0
    assert set(answer["space"]) == {"North", "South"}
    assert all(space["used"] <= space["limit"] + 1e-6 for space in answer["space"].values())
    assert "80 % interval" in done.words
    rows = rows_of(path, RECOMMEND)
    assert {row["plan"] for row in rows} <= {"in", "out", "as today"}
    assert {row["action"] for row in rows} <= {"keep", "list", "delist", "extend", "withdraw"}
    assert sum(row["action"] != "keep" for row in rows) == answer["changes"]
    assert all(0.0 <= float(row["today"]) <= 1.0 for row in rows)
    assert all((float(row["units_per_week"]) > 0.0) == (row["plan"] != "out") for row in rows)
    money = math.fsum(float(row["margin_per_week"]) for row in rows)
    assert money == pytest.approx(answer["value"], rel=1e-9)
    review = RangeReview()
    review.open(plan)
    assert review.plan().name == "best plan"
    assert (review.states == review.today_states()).all()
    review.close()


def test_recommend_within_changes_and_goal(plan: Path) -> None:
    one = call("recommend", "--plan", plan, "--changes", 1, "--name", "one").answer
    assert (one["changes"], one["name"]) == (1, "one")
    assert [rung["changes"] for rung in one["ladder"]] == [0, 1]
    none = call("recommend", "--plan", plan, "--changes", 0).answer
    assert none["value"] == pytest.approx(none["today_value"])
    units = call("recommend", "--plan", plan, "--goal", "units").answer
    assert units["goal"] == "units"
    assert units["estimate"]["units"]["after"] == pytest.approx(units["value"])


def test_recommend_again_gives_the_same(plan: Path) -> None:
    first = call("recommend", "--plan", plan, "--gap", 0).answer
    again = call("recommend", "--plan", plan, "--gap", 0).answer
    assert again["value"] == pytest.approx(first["value"], abs=1e-8)
    assert again["bound"] == pytest.approx(first["bound"], abs=1e-8)


def test_recommend_under_limits_of_a_file(plan: Path, tmp_path: Path) -> None:
    limits = tmp_path / "limits.toml"
    limits.write_text(
        'goal = "sales"\n[[lock]]\nitem = "0011"\nkind = "never"\n[[lock]]\nitem = "0090"\nkind = "keep"\n'
        'cluster = "North"\n[[cluster]]\nname = "South"\nmax_items = 6\n',
        encoding="utf-8",
    )
    path = tmp_path / "r.csv"
    done = call("recommend", "--plan", plan, "--limits", limits, "--csv", path)
    assert done.code == 0, done.errors
    assert done.answer["goal"] == "sales"
    rows = rows_of(path, RECOMMEND)
    listed = {(row["cluster"], row["item"]) for row in rows if row["plan"] != "out"}
    assert not {("North", "0011"), ("South", "0011")} & listed
    assert ("North", "0090") in listed
    assert sum(cluster == "South" for cluster, _item in listed) <= 6
    assert (
        call("recommend", "--plan", plan, "--limits", limits, "--goal", "margin").answer["goal"] == "margin"
    )


def test_limits_that_nothing_meets(plan: Path, tmp_path: Path) -> None:
    limits = tmp_path / "limits.toml"
    limits.write_text('[[cluster]]\nname = "South"\nspace = 20.0\nmin_items = 9\n', encoding="utf-8")
    before = plan.read_bytes()
    done = call("recommend", "--plan", plan, "--limits", limits)
    assert done.code == 4
    assert (done.answer["status"], done.answer["exit"]) == ("impossible", 4)
    assert (done.answer["value"], done.answer["bound"], done.answer["gap"]) == (None, None, None)
    assert "South" in done.errors
    assert plan.read_bytes() == before


@pytest.mark.parametrize(
    ("text", "arguments"),
    [
        ('[[lock]]\nitem = "12"\nkind = "keep"\n', ()),
        ('[[cluster]]\nname = "West"\nspace = 1.0\n', ()),
        ("goal = glory\n", ()),
        ("max_change = 3\n", ()),
        ("", ("--changes", "-1")),
        ("", ("--seconds", "0")),
        ("", ("--seconds", "nan")),
        ("", ("--gap", "-0.1")),
        ("", ("--goal", "glory")),
        ("", ("--csv", "r.xlsx")),
        ("", ("--name", " ")),
    ],
)
def test_what_recommend_refuses(plan: Path, text: str, arguments: tuple[str, ...]) -> None:
    limits = plan.with_name("limits.toml")
    limits.write_text(text, encoding="utf-8")
    before = plan.read_bytes()
    assert call("recommend", "--plan", plan, "--limits", limits, *arguments).code == 2
    assert plan.read_bytes() == before


def test_without_costs_the_goal_is_sales_and_margin_is_null(folder: Path, tmp_path: Path) -> None:
    for name in ("sales", "stores", "shoppers", "ranges"):
        shutil.copy(folder / f"{name}.csv", tmp_path / f"{name}.csv")
    rows = list(csv.reader((folder / "items.csv").read_text(encoding="utf-8").splitlines()))
    cost = rows[0].index("unit_cost")
    with (tmp_path / "items.csv").open("w", encoding="utf-8", newline="") as file:
        csv.writer(file).writerows(row[:cost] + row[cost + 1 :] for row in rows)
    plan = tmp_path / "p.rangewright"
    done = call("review", tmp_path, "--workbook", tmp_path / "o.xlsx", "--plan", plan)
    assert done.code == 0, done.errors
    assert done.answer["plan"]["goal"] == "sales"
    assert set(done.answer["plan"]["estimate"]["margin"].values()) == {None}
    assert "No cost" in done.words
    assert "Category margin" not in done.words
    assert set(call("transfer", "--plan", plan, "--delist", "0012").answer["margin"].values()) == {None}
