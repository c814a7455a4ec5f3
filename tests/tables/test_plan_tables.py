"""Plan, transfer and limits by value; the two files that scripts read, row by row."""

from __future__ import annotations

import csv
import io
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from planner.base.errors import CallError
from planner.plan.limits import ClusterLimit, ItemLock, Limits
from planner.tables.csv import write_csv
from planner.tables.ladder import ladder_table
from planner.tables.limits import limits_table
from planner.tables.names import action_of, changed_pairs
from planner.tables.plan import cluster_of, item_list_table, plan_table, plans_compared_table
from planner.tables.receivers import receivers_table
from planner.tables.table import Table
from planner.tables.tally import tally_table
from planner.tables.transfer import transfer_table
from planner.transfer.tally import Tally, tally
from planner.transfer.what_if import AS_TODAY, IN, OUT, WhatIf, presence
from tests.tables import records


def planned_tally() -> Tally:
    return tally(records.fitted(), records.base_week(), records.planned())


def rows(table: Table) -> list[dict[str, object]]:
    keys = [column.key for column in table.columns]
    return [dict(zip(keys, row, strict=True)) for row in zip(*(c.values for c in table.columns), strict=True)]


def simple_effects() -> tuple[WhatIf, np.ndarray]:
    """Two draws; in Large item 0104 (10 units) goes: 6 to 0101, 2 to 0102, 2 leave (draws: 5, 7 to 0101)."""
    before = np.zeros((3, 8))
    before[:, :4] = [[20.0, 10.0, 0.0, 10.0], [8.0, 0.0, 0.0, 0.0], [0.0, 0.0, 0.0, 0.0]]
    after = before.copy()
    after[0, :4] = [26.0, 12.0, 0.0, 0.0]
    draws_after = np.stack([after, after])
    draws_after[0, 0, 0], draws_after[1, 0, 0] = 25.0, 27.0
    changed = np.zeros((3, 8), dtype=bool)
    changed[0, 3] = True
    return WhatIf(before, after, np.stack([before, before]), draws_after), changed


def as_csv(table: Table, folder: Path) -> list[dict[str, str]]:
    path = folder / "out.csv"
    write_csv(table, path)
    return list(csv.DictReader(io.StringIO(path.read_text(encoding="utf-8"))))


def test_transfer_file_row_by_row(tmp_path: Path) -> None:
    effects, changed = simple_effects()
    found = as_csv(transfer_table(records.catalogue(), effects, changed), tmp_path)
    header = list(found[0])
    assert header == [
        "cluster", "affected_item", "units_per_week_before", "units_per_week_after",
        "change", "share", "low", "high",
    ]  # fmt: skip
    golden = [
        ("Large", "0104", 10.0, 0.0, -10.0, -1.0, -1.0, -1.0),
        ("Large", "0101", 20.0, 26.0, 6.0, 0.6, 0.52, 0.68),
        ("Large", "0102", 10.0, 12.0, 2.0, 0.2, 0.2, 0.2),
        ("Large", "", None, None, 2.0, 0.2, 0.12, 0.28),
        ("Middle", "0104", 0.0, 0.0, 0.0, None, None, None),
        ("Middle", "0101", 8.0, 8.0, 0.0, None, None, None),
        ("Middle", "", None, None, 0.0, None, None, None),
        ("Small", "0104", 0.0, 0.0, 0.0, None, None, None),
        ("Small", "", None, None, 0.0, None, None, None),
        ("ALL", "0104", 10.0, 0.0, -10.0, -1.0, -1.0, -1.0),
        ("ALL", "0101", 28.0, 34.0, 6.0, 0.6, 0.52, 0.68),
        ("ALL", "0102", 10.0, 12.0, 2.0, 0.2, 0.2, 0.2),
        ("ALL", "", None, None, 2.0, 0.2, 0.12, 0.28),
    ]
    assert len(found) == len(golden)
    for row, expected in zip(found, golden, strict=True):
        assert (row["cluster"], row["affected_item"]) == expected[:2]
        for key, value in zip(header[2:], expected[2:], strict=True):
            if value is None:
                assert row[key] == ""
            else:
                assert float(row[key]) == pytest.approx(value, abs=1e-12)


def test_transfers_add_up_in_every_cluster() -> None:
    found = rows(transfer_table(records.catalogue(), planned_tally().effects, _changed()))
    for cluster in ("Large", "Middle", "Small", "ALL"):
        mine = [row for row in found if row["cluster"] == cluster]
        assert sum(float(str(row["change"])) for row in mine) == pytest.approx(0.0, abs=1e-9)
        leaves = [row for row in mine if row["affected_item"] == ""]
        assert len(leaves) == 1
        assert leaves[0]["units_per_week_before"] is None


def _changed() -> np.ndarray:
    data = records.loaded()
    return changed_pairs(data.base.today, cluster_of(data), records.planned())


def test_shares_of_a_delisting_add_to_one_and_match_a_recomputation() -> None:
    data, fitted = records.loaded(), records.fitted()
    states = records.now().copy()
    states[:, 4] = OUT
    changed = changed_pairs(data.base.today, cluster_of(data), states)
    effects = tally(fitted, data.base, states).effects
    found = {
        row["affected_item"]: row
        for row in rows(transfer_table(data.catalogue, effects, changed))
        if row["cluster"] == "ALL"
    }
    assert found["0201"]["share"] == pytest.approx(-1.0)
    others = sum(float(str(row["share"])) for code, row in found.items() if code != "0201")
    assert others == pytest.approx(1.0)
    demand = fitted.estimate
    before = demand.units(data.base.today)[0].sum(axis=0)
    after = demand.units(presence(states, data.base.today, demand.cluster))[0].sum(axis=0)
    assert found["0202"]["share"] == pytest.approx((after[5] - before[5]) / before[4])


def test_recommend_file_row_by_row(tmp_path: Path) -> None:
    data = records.loaded()
    effects, _changed_items = simple_effects()
    states = records.planned()
    found = as_csv(plan_table(data, effects, states), tmp_path)
    assert list(found[0]) == [
        "cluster",
        "item",
        "today",
        "plan",
        "action",
        "units_per_week",
        "margin_per_week",
    ]
    golden = {
        ("Large", "0101"): (1.0, "in", "keep"),
        ("Large", "0104"): (1.0, "out", "delist"),
        ("Large", "0301"): (0.0, "in", "list"),
        ("Middle", "0104"): (0.5, "out", "withdraw"),
        ("Middle", "0202"): (0.5, "in", "extend"),
        ("Small", "0202"): (0.5, "as today", "keep"),
        ("Small", "0203"): (0.5, "as today", "keep"),
        ("Small", "0103"): (1.0, "in", "keep"),
    }
    by_pair = {(row["cluster"], row["item"]): row for row in found}
    for pair, (today, plan, action) in golden.items():
        row = by_pair[pair]
        assert (float(row["today"]), row["plan"], row["action"]) == (today, plan, action)
    # On no list today and on none in the plan: no row.
    assert ("Middle", "0301") not in by_pair
    assert ("Small", "0104") not in by_pair
    assert len(found) == len(by_pair) == 20
    row = by_pair["Large", "0101"]
    assert float(row["units_per_week"]) == 26.0
    assert float(row["margin_per_week"]) == pytest.approx(26.0 * data.base.margin[0, 0])


def test_margin_is_empty_where_the_cost_is_unknown() -> None:
    data = records.loaded()
    margin = data.base.margin.copy()
    margin[:, 1] = np.nan
    found = rows(
        plan_table(replace(data, base=replace(data.base, margin=margin)), simple_effects()[0], records.now())
    )
    blank = {row["item"] for row in found if row["margin_per_week"] is None}
    assert blank == {"0102"}


@pytest.mark.parametrize(
    ("today", "plan", "action"),
    [
        (IN, IN, "keep"), (IN, OUT, "delist"), (OUT, IN, "list"), (OUT, OUT, ""),
        (AS_TODAY, AS_TODAY, "keep"), (AS_TODAY, IN, "extend"), (AS_TODAY, OUT, "withdraw"),
        (IN, AS_TODAY, "keep"),
    ],
)  # fmt: skip
def test_actions(today: int, plan: int, action: str) -> None:
    assert action_of(today, plan) == action


def test_item_list_puts_actions_first_and_gives_the_reasons() -> None:
    plan = records.plan()
    table = item_list_table(records.loaded(), planned_tally().effects, plan.states, plan.reasons)
    found = rows(table)
    large = [row["action"] for row in found if row["cluster"] == "Large"]
    assert large[:2] == ["list", "delist"]
    assert set(large[2:]) == {"keep"}
    reasons = {(row["cluster"], row["item"]): row["reason"] for row in found if row["reason"]}
    assert reasons == {
        ("Large", "0104"): "slow, and twin of 0101",
        ("Middle", "0104"): "slow, and twin of 0101",
        ("Large", "0301"): "new flavour",
    }
    only = item_list_table(records.loaded(), planned_tally().effects, plan.states, cluster="Small")
    assert set(only.column("cluster").values) == {"Small"}


def test_receivers_order_sums_and_what_leaves() -> None:
    data = records.loaded()
    effects, changed = simple_effects()
    found = rows(receivers_table(data, effects, changed=changed))
    items = [row for row in found if row["kind"] == "item"]
    assert [row["item"] for row in items] == ["0101", "0102"]
    assert [row["change"] for row in items] == [6.0, 2.0]
    assert found[0]["kind"] == "changed"
    assert found[-1]["kind"] == "leaves"
    assert found[-1]["change"] == pytest.approx(2.0)
    assert found[-1]["before"] is None
    suppliers = {row["description"]: row["share"] for row in found if row["kind"] == "supplier"}
    assert suppliers["North Foods"] == pytest.approx(0.8)
    own = {row["description"]: row["change"] for row in found if row["kind"] == "own label"}
    assert own == {"Brands": 8.0, "Own label": 0.0}


def test_receivers_in_content_and_money_and_one_cluster() -> None:
    data = records.loaded()
    effects, changed = simple_effects()
    content = {row["item"]: row["change"] for row in rows(receivers_table(data, effects, "content", changed))}
    assert content["0101"] == pytest.approx(6.0 * 50.0)
    money = {row["item"]: row["change"] for row in rows(receivers_table(data, effects, "money", changed))}
    assert money["0101"] == pytest.approx(6.0 * 3.0 / 1.2)
    middle = receivers_table(data, effects, changed=changed, cluster="Middle")
    assert set(middle.column("share").values) == {None}
    with pytest.raises(CallError, match="no cluster 'Nowhere'"):
        receivers_table(data, effects, cluster="Nowhere")
    with pytest.raises(CallError, match="'boxes' is not a measure"):
        receivers_table(data, effects, "boxes")


def test_changed_items_are_found_from_units_when_not_given() -> None:
    effects, _changed_items = simple_effects()
    found = rows(receivers_table(records.loaded(), effects))
    assert [row["item"] for row in found if row["kind"] == "changed"] == ["0104"]


def test_tally_rows_match_the_record() -> None:
    data, figures = records.loaded(), planned_tally()
    found = {row["key"]: row for row in rows(tally_table(data, figures)) if row["key"] != "space"}
    assert found["margin"]["change"] == pytest.approx(figures.margin.change)
    assert found["units"]["low"] == pytest.approx(figures.units.low)
    assert found["items"]["today"] == found["items"]["plan"] == 7
    assert found["changes"]["plan"] == 4
    space = [row for row in rows(tally_table(data, figures)) if row["key"] == "space"]
    assert [row["limit"] for row in space] == [62.0, 50.0, 40.0]
    assert [row["plan"] for row in space] == [56.0, 49.0, 33.0]


def test_without_costs_there_is_no_margin_row_and_it_is_said() -> None:
    data = records.without_costs(records.loaded())
    figures = tally(records.fitted(), data.base, records.planned())
    table = tally_table(data, figures)
    assert "margin" not in table.column("key").values
    assert any("add costs" in note for note in table.notes)


def test_some_costs_missing_are_named() -> None:
    data = records.loaded()
    margin = data.base.margin.copy()
    margin[:, [1, 4]] = np.nan
    data = replace(data, base=replace(data.base, margin=margin))
    notes = " ".join(tally_table(data, planned_tally()).notes)
    assert "0102, 0201" in notes
    units = data.base.units * data.base.today
    share = 1.0 - units[:, [1, 4]].sum() / units.sum()
    assert f"{share:.0%}" in notes


def test_ladder_names_what_is_new_and_what_is_gone() -> None:
    plan = records.plan()
    other = records.now().copy()
    other[2, 5] = OUT
    rungs = (*plan.rungs[:2], replace(plan.rungs[2], states=other))
    found = rows(ladder_table(records.loaded(), tuple(reversed(rungs))))
    assert [row["changes"] for row in found] == [0, 2, 4]
    assert [row["made"] for row in found] == [0, 2, 1]
    assert found[1]["new"] == "delist 0104 in Large, list 0301 in Large"
    assert found[2]["new"] == "withdraw 0202 in Small"
    assert found[2]["dropped"] == found[1]["new"]
    assert found[1]["gain"] == pytest.approx(9.8)
    assert found[1]["gap"] == pytest.approx(1.0 / 411.0)


def test_limits_show_what_is_used_and_whether_they_are_met() -> None:
    found = rows(limits_table(records.loaded(), records.limits(), records.planned()))
    by_key: dict[object, list[dict[str, object]]] = {}
    for row in found:
        by_key.setdefault(row["key"], []).append(row)
    assert by_key["max_changes"][0]["room"] == 2.0
    assert [row["used"] for row in by_key["space"]] == [56.0, 49.0, 33.0]
    assert "S4" in str(by_key["space"][1]["words"])
    assert by_key["min_items"][0]["room"] == 2.0
    assert by_key["max_items"][0]["room"] == 0.0
    assert all(
        row["met"]
        for key, group in by_key.items()
        if key not in {"goal", "listing_cost", "delisting_cost"}
        for row in group
    )


def test_broken_limits_are_shown_as_not_met() -> None:
    states = records.planned()
    states[0, 6], states[0, 0] = OUT, OUT
    limits = Limits(
        max_changes=2,
        clusters=(ClusterLimit("Large", space=30.0, min_items=7, max_items=4),),
        locks=(ItemLock("0203", "keep"), ItemLock("0301", "never"), ItemLock("0101", "as today", "Large")),
    )
    found = rows(limits_table(records.loaded(), limits, states))
    broken = {(row["key"], row["where"]) for row in found if row["met"] is False}
    assert broken == {
        ("max_changes", ""), ("cluster_space", "Large"), ("min_items", "Large"), ("max_items", "Large"),
        ("lock", "0203"), ("lock", "0301"), ("lock", "0101, Large"),
    }  # fmt: skip


def test_saved_plans_side_by_side() -> None:
    plan, figures = records.plan(), planned_tally()
    hand = replace(plan, name="By hand", outcome=None)
    found = rows(plans_compared_table(records.loaded(), [plan, hand], [figures, figures]))
    assert [row["status"] for row in found] == ["within target", "made by hand"]
    assert found[0]["margin_change"] == pytest.approx(figures.margin.change)
    assert found[1]["gap"] is None
