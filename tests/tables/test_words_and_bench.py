"""Sales, evidence and bench tables, and the sentences."""

from __future__ import annotations

import subprocess
import sys
from dataclasses import replace
from decimal import Decimal
from pathlib import Path

import numpy as np
import pytest

import planner.tables
from planner.evidence.history import history
from planner.plan.limits import ItemLock
from planner.tables.bench import bench_table
from planner.tables.evidence import parameters_table, segments_table
from planner.tables.names import plan_word
from planner.tables.sales import checks_table, events_table, matches_table, reconciliation_table
from planner.tables.words import (
    beyond_history,
    category_price_response,
    cautions,
    evidence_words,
    notes,
    own_price_response,
    stays_inside,
)
from planner.transfer.delistings import delistings
from tests.tables import records


def test_reconciliation_is_exact() -> None:
    table = reconciliation_table(records.report())
    assert table.column("money").values == (Decimal("10123.45"), Decimal("23.05"), Decimal("10100.40"))
    assert "to the smallest unit" in table.notes[0]
    off = replace(records.report(), money_used=Decimal("10100.41"))
    assert "differs" in reconciliation_table(off).notes[0]
    assert "-0.01" in reconciliation_table(off).notes[0]


def test_checks_give_places() -> None:
    table = checks_table(records.report())
    assert table.column("examples").values[0] == "sales.csv row 17: store=S1, item=0101; sales.csv row 18"
    assert table.column("examples").values[1] == "items.csv: 0104"
    assert table.column("share").values[0] == pytest.approx(23.05 / 10123.45)
    assert matches_table(records.report()).column("their_name").values == ("qty", "turnover")


def test_events_are_ordered_by_the_money_at_stake() -> None:
    data = records.loaded()
    table = events_table(data)
    panel = data.panel
    before = (panel.store_index == 3) & (panel.week_index < 5)
    money = (panel.units[before, 3] * panel.price[before, 3]).sum() / 5
    place = table.column("item").values.index("0104")
    assert table.column("money").values[place] == pytest.approx(money)
    values = [float(str(v)) for v in table.column("money").values]
    assert values == sorted(values, reverse=True)
    assert table.column("stores").values == (1, 1)
    assert events_table(data, top=1).n_rows == 1


def test_bench_groups_by_segment_and_shows_the_plan() -> None:
    data, fitted = records.loaded(), records.fitted()
    transfers = delistings(fitted, data.base)
    table = bench_table(
        data, fitted, transfers, records.planned(), (ItemLock("0203", "keep", "Large", "asked for"),)
    )
    assert table.column("segment").values == ("Green",) * 4 + ("Herbal",) * 3 + ("Rooibos",)
    by_item = {code: k for k, code in enumerate(table.column("item").values)}
    row = {c.key: c.values[by_item["0104"]] for c in table.columns}
    assert row["today"] == pytest.approx(0.5)
    assert (row["plan"], row["in_plan"], row["changed"]) == ("out", False, True)
    assert row["stays"] == pytest.approx(transfers.stays[3])
    assert row["margin_lost"] == pytest.approx(-transfers.margin_change[3])
    assert row["margin_lost_low"] == pytest.approx(-transfers.margin_high[3])
    offer = {c.key: c.values[by_item["0301"]] for c in table.columns}
    assert (offer["plan"], offer["in_plan"], offer["stays"]) == ("1 in, 2 out", None, None)
    assert table.column("lock").values[by_item["0203"]] == "keep in Large: asked for"


def test_bench_rate_of_sale_counts_only_weeks_on_sale() -> None:
    data = records.loaded()
    table = bench_table(data, None, None, records.now())
    place = table.column("item").values.index("0202")
    panel = data.panel
    window = (panel.week_index >= 4) & panel.listed[:, 5]
    assert table.column("rate_of_sale").values[place] == pytest.approx(panel.units[window, 5].mean())
    first = table.column("item").values.index("0101")
    promoted = panel.promotion[:, 0] > 0.5
    assert table.column("rate_on_promotion").values[first] == pytest.approx(panel.units[promoted, 0].mean())
    assert set(table.column("stays").values) == {None}
    assert any("Fit the share model" in note for note in table.notes)


def test_bench_of_one_cluster() -> None:
    data = records.loaded()
    table = bench_table(data, None, None, records.planned(), cluster="Middle")
    place = table.column("item").values.index("0202")
    assert table.column("today").values[place] == 0.5
    assert table.column("plan").values[place] == "in"
    assert table.column("price").values[place] == pytest.approx(data.base.price[1, 5])


def test_margin_lost_is_empty_without_the_items_own_cost() -> None:
    data = records.loaded()
    margin = data.base.margin.copy()
    margin[:, 0] = np.nan
    data = replace(data, base=replace(data.base, margin=margin))
    table = bench_table(data, records.fitted(), delistings(records.fitted(), data.base), records.now())
    blank = [
        code
        for code, v in zip(table.column("item").values, table.column("margin_lost").values, strict=True)
        if v is None
    ]
    assert blank == ["0101", "0301"]


def test_plan_words() -> None:
    now = np.array([1, 2, 0], dtype=np.int8)
    assert plan_word(now, now) == "as today"
    assert plan_word(np.array([1, 1, 1], dtype=np.int8), now) == "in"
    assert plan_word(np.array([0, 0, 0], dtype=np.int8), now) == "out"
    assert plan_word(np.array([0, 2, 1], dtype=np.int8), now) == "1 in, 1 as today, 1 out"


def test_segments_and_parameters() -> None:
    table = segments_table(records.fitted())
    assert table.column("ratio").values == (0.40, 0.60, 0.80)
    assert table.column("events").values == (7, 2, 0)
    assert parameters_table(records.fitted()).column("value").values == (-1.5, 0.6)


def test_stays_inside_by_hand() -> None:
    # Item 0 (10 units): 6 to its twin 1, 1 to item 2, 3 leave.  Item 1 (5 units): 2 to 0, 1 to 2, 2 leave.
    moved = np.array([[-10.0, 6.0, 1.0, 3.0], [2.0, -5.0, 1.0, 2.0], [1.0, 1.0, -4.0, 2.0]])
    inside = stays_inside(moved, np.array([10.0, 5.0, 4.0]), np.array([0, 0, 1]))
    assert inside == pytest.approx([8.0 / 15.0, 0.0])


def test_price_responses_match_the_closed_form() -> None:
    data, fitted = records.loaded(), records.fitted()
    # All prices of a volume model up by 1 %: W moves by 1.01 ** (slope * power) in every segment ...
    every, low, high = category_price_response(data, fitted)
    parts = fitted.estimate.parts(data.base.today)
    power = fitted.estimate.power()[0]
    volume = (parts.total * parts.ratio)[0]
    moved = (volume * 1.01 ** (-1.5 * power)).sum(axis=1) / volume.sum(axis=1)
    units = parts.category[0]
    assert every == pytest.approx((units * moved**0.6).sum() / units.sum() - 1.0)
    assert low < every < high < 0.0
    # ... and one alone loses more of its own, because others receive.
    assert own_price_response(data, fitted) < every


def test_words_put_first_what_the_history_cannot_tell() -> None:
    data, fitted = records.loaded(), records.fitted()
    said = evidence_words(data, fitted, delistings(fitted, data.base), history(data.panel, data.catalogue))
    assert "Herbal" in said[0]
    assert "fewer than 5" in said[0]
    assert "Nothing was sold yet in: Rooibos" in said[1]
    closed = next(text for text in said if text.startswith("Green:"))
    assert "80 % interval 0.33 to 0.48" in closed
    assert "7 listing changes" in closed
    assert not any(text.startswith("Rooibos:") for text in said)
    everything = " ".join(said).lower()
    assert "proved" not in everything
    assert " will " not in everything


def test_plain_model_is_said_to_ask_nothing() -> None:
    data, fitted = records.loaded(), replace(records.fitted(), model="plain")
    said = evidence_words(data, fitted, delistings(fitted, data.base), history(data.panel, data.catalogue))
    assert said[0].startswith("The plain model")
    assert "between closed" not in " ".join(said)


def test_price_effects_that_make_no_sense_are_called_out() -> None:
    fitted = records.fitted()
    up = replace(fitted.estimate, price_effect=-fitted.estimate.price_effect)
    data = records.loaded()
    transfers, past = delistings(fitted, data.base), history(data.panel, data.catalogue)
    said = " ".join(evidence_words(data, replace(fitted, estimate=up), transfers, past))
    assert "not believable" in said
    still = replace(fitted.estimate, price_effect=np.zeros((1, 3)))
    said = " ".join(evidence_words(data, replace(fitted, estimate=still), transfers, past))
    assert "moved too little" in said


def test_ranges_never_seen_before_are_called_out() -> None:
    data = records.loaded()
    assert beyond_history(data, records.planned()) == ""
    short = records.now().copy()
    short[0, :6] = 0
    said = beyond_history(data, short)
    # Stores S1 and S2 always had 7 items; the plan leaves one.
    assert said.startswith("In 2 of 6 stores the plan's number of items (1)")
    assert "(7)" in said
    assert "extrapolates" in said


def test_cautions_and_notes() -> None:
    text = " ".join(cautions())
    assert "supply contracts" in text
    assert "infant formula" in text
    assert notes(records.loaded(), records.fitted())[-1] == "Fitted on 60 store-weeks."


def test_tables_do_not_load_the_heavy_libraries() -> None:
    modules = [path.stem for path in Path(planner.tables.__file__).parent.glob("*.py")]
    code = (
        f"import sys, {', '.join('planner.tables.' + m for m in modules if m != '__init__')}\n"
        "print(*[n for n in ('pandas', 'scipy', 'pyarrow', 'openpyxl', 'matplotlib') if n in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.split() == []
