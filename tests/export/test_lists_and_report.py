"""The stores' list and the printed report."""

from __future__ import annotations

import csv
from dataclasses import replace
from pathlib import Path

import pytest

from planner.base.errors import CallError
from planner.export import words
from planner.export.lists import harmless, write_stores_list
from planner.export.report import write_report
from planner.plan.plans import SolverOutcome
from planner.transfer.tally import tally
from planner.transfer.what_if import presence
from tests.tables import records


def read(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def test_stores_list_says_what_each_store_does(tmp_path: Path) -> None:
    path = tmp_path / "stores.csv"
    write_stores_list(path, records.loaded(), records.plan())
    rows = read(path)
    assert list(rows[0]) == [
        "store", "cluster", "action", "item", "description", "segment", "brand", "own_label", "space",
        "price",
    ]  # fmt: skip
    todo = {(row["store"], row["item"]): row["action"] for row in rows if row["action"] != "keep"}
    assert todo == {
        ("S1", "0301"): "list",
        ("S2", "0301"): "list",
        ("S1", "0104"): "delist",
        ("S2", "0104"): "delist",
        # Partly listed in Middle: only S3 has it, only S4 gets the other.
        ("S3", "0104"): "withdraw",
        ("S3", "0202"): "extend",
    }
    present = presence(records.planned(), records.TODAY, records.demand(1, 0.0).cluster)
    listed = {(row["store"], row["item"]) for row in rows if float(row["space"]) > 0.0}
    codes = [item.code for item in records.ITEMS]
    assert listed == {(f"S{s + 1}", codes[j]) for s in range(6) for j in range(8) if present[s, j]}


def test_stores_list_has_no_cost_unless_asked(tmp_path: Path) -> None:
    path = tmp_path / "stores.csv"
    write_stores_list(path, records.loaded(), records.plan())
    header = path.read_text(encoding="utf-8").splitlines()[0]
    assert "cost" not in header
    assert "margin" not in header
    write_stores_list(path, records.loaded(), records.plan(), with_costs=True)
    row = next(row for row in read(path) if row["item"] == "0203" and row["store"] == "S1")
    assert float(row["cost"]) == 1.0
    assert float(row["margin"]) == pytest.approx(3.0 / 1.2 - 1.0)


def test_names_are_harmless_in_a_spreadsheet_and_codes_untouched(tmp_path: Path) -> None:
    path = tmp_path / "stores.csv"
    write_stores_list(path, records.loaded(), records.plan())
    names = {row["item"]: row["description"] for row in read(path)}
    assert names["0102"] == "'=1+1"
    assert names["0101"] == "Green leaf 50"
    assert [harmless(text) for text in ("+a", "-b", "@c", "\td", "e=1", "")] == [
        "'+a",
        "'-b",
        "'@c",
        "'\td",
        "e=1",
        "",
    ]


def test_report_is_a_pdf_and_the_same_each_time(tmp_path: Path) -> None:
    first, second = tmp_path / "a.pdf", tmp_path / "b.pdf"
    data, fitted = records.loaded(), records.fitted()
    plan = replace(records.plan(), name="Spring $x^2$ and a long name " * 4, notes="Long note. " * 60)
    write_report(first, data, fitted, plan)
    write_report(second, data, fitted, plan)
    assert first.read_bytes().startswith(b"%PDF-")
    assert first.read_bytes() == second.read_bytes()
    with pytest.raises(CallError, match=r"expected \.pdf"):
        write_report(tmp_path / "a.txt", data, fitted, plan)


def test_report_without_costs_leaves_the_margin_out(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    printed: list[str] = []

    def note(text: str) -> str:
        printed.append(text)
        return text

    monkeypatch.setattr("planner.export.report.plain", note)
    write_report(tmp_path / "a.pdf", records.loaded(), records.fitted(), records.plan(), with_costs=False)
    said = " ".join(printed)
    margin = tally(records.fitted(), records.base_week(), records.planned()).margin
    assert "Estimated change of sales" in said
    assert "Category margin a week" not in said
    for secret in (f"{margin.plan:,.0f}", f"{margin.today:,.0f}", "417.6", "418.0", "401.2", "2.50"):
        assert secret not in printed
        assert secret not in said.split()
    printed.clear()
    write_report(tmp_path / "b.pdf", records.loaded(), records.fitted(), records.plan())
    assert f"{margin.plan:,.0f}" in printed
    assert "Category margin a week" in printed


def test_words_say_when_the_interval_includes_nothing() -> None:
    data, plan = records.loaded(), records.plan()
    figures = tally(records.fitted(), data.base, plan.states)
    assert "includes no change" not in words.headline(data, figures, plan, True)[0]
    wide = replace(figures, margin=replace(figures.margin, low=-5.0))
    assert "includes no change" in words.headline(data, wide, plan, True)[0]


def test_words_never_call_a_stopped_search_proved() -> None:
    data, plan = records.loaded(), records.plan()
    figures = tally(records.fitted(), data.base, plan.states)
    stopped = replace(plan, outcome=SolverOutcome("stopped early", 400.0, 900.0, 1.25, 20.0, 390.0))
    said = " ".join(words.solver_words(data, figures, stopped, True))
    assert "stopped before its target" in said
    assert "gap 125.00 %" in said
    # The interval is narrower than this gap, so nothing is said of it being wider.
    assert "interval above" not in said
    assert "interval above" in " ".join(words.solver_words(data, figures, plan, True))
    assert "only" not in words.solver_words(data, figures, replace(plan, outcome=None), True)[0]


def test_limits_in_words() -> None:
    said = " ".join(words.limits_words(records.limits(), True))
    assert "At most 6 changes." in said
    assert "Large: space at most 64.0, at least 5 items, at most 7 items." in said
    assert "3 locks" in said
    assert "2.50" in said
    assert "2.50" not in " ".join(words.limits_words(records.limits(), False))
