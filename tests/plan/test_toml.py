"""Limits written as TOML come back the same; what is wrong is named with its place."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from planner.base.errors import CallError
from planner.plan.limits import GOALS, ClusterLimit, ItemLock, Limits
from planner.plan.toml import LOCK_KINDS, limits_of_text, read_limits, text_of_limits, write_limits

texts = st.text(st.characters(exclude_categories=["Cs"]), max_size=12)
codes = st.text(st.characters(exclude_categories=["Cs"]), min_size=1, max_size=12)
amounts = st.floats(0.0, 1e12)
counts = st.none() | st.integers(0, 500)
clusters = st.builds(ClusterLimit, texts, st.none() | amounts, st.none(), counts)
locks = st.builds(
    ItemLock, codes, st.sampled_from(LOCK_KINDS), texts, texts, st.dates().map(str) | st.just("")
)


@given(
    st.builds(
        Limits,
        st.sampled_from(GOALS),
        counts,
        st.lists(clusters, max_size=3, unique_by=lambda limit: limit.cluster).map(tuple),
        st.lists(locks, max_size=3).map(tuple),
        amounts,
        amounts,
    )
)
def test_limits_come_back_exactly(limits: Limits) -> None:
    assert limits_of_text(text_of_limits(limits)) == limits


def test_documented_example() -> None:
    text = """
        goal = "sales"
        max_changes = 8
        listing_cost = 5
        [[cluster]]
        name = "Large"
        space = 480
        max_items = 60
        [[lock]]
        item = "004711"
        kind = "keep"
        until = 2026-12-31
    """
    assert limits_of_text(text) == Limits(
        goal="sales",
        max_changes=8,
        clusters=(ClusterLimit("Large", 480.0, None, 60),),
        locks=(ItemLock("004711", "keep", until="2026-12-31"),),
        listing_cost=5.0,
    )
    assert limits_of_text("") == Limits()


@pytest.mark.parametrize(
    ("text", "problem", "remedy"),
    [
        ('aim = "margin"', "unknown key 'aim'", "max_changes"),
        ('goal = "profit"', "goal = 'profit' is not known", "margin, sales, units"),
        ("max_changes = -1", "max_changes = -1 is not a whole number", ""),
        ("max_changes = 2.5", "2.5", ""),
        ("max_changes = true", "True", ""),
        ("listing_cost = nan", "nan", ""),
        (f"listing_cost = {10**400}", "is not a number", ""),
        ('listing_cost = "5"', "'5'", ""),
        ("goal = 3", "is not a text", "quotes"),
        ("cluster = 3", "[[cluster]]", ""),
        ("lock = [1]", "expected a table", ""),
        ("[[cluster]]\nspace = 1", "name is missing", ""),
        ('[[cluster]]\nname = "A"\nmin_items = 5\nmax_items = 4', "5 is above max_items 4", ""),
        ('[[cluster]]\nname = "A"\n[[cluster]]\nname = "A"', "'A' stands there twice", ""),
        ('[[lock]]\nkind = "keep"', "item is missing", ""),
        ('[[lock]]\nitem = "1"\nkind = "hold"', "kind = 'hold'", "keep, never, as today"),
        ('[[lock]]\nitem = "1"', "kind = ''", "keep"),
        ('[[lock]]\nitem = 4711\nkind = "keep"', "4711", "quotes"),
        ('[[lock]]\nitem = "1"\nkind = "keep"\nuntil = "soon"', "'soon' is not a date", "2026-12-31"),
        ("goal = margin", "this is not TOML", "goal"),
    ],
)
def test_mistakes_are_named(text: str, problem: str, remedy: str) -> None:
    with pytest.raises(CallError) as caught:
        limits_of_text(text, "limits.toml")
    assert problem in caught.value.problem
    assert remedy in caught.value.remedy
    assert caught.value.place.startswith("limits.toml")


def test_the_place_counts_the_tables() -> None:
    with pytest.raises(CallError) as caught:
        limits_of_text('[[lock]]\nitem = "1"\nkind = "keep"\n[[lock]]\nitem = "2"\nwhy = "x"', "l.toml")
    assert caught.value.place == "l.toml [[lock]] 2"


def test_files(tmp_path: Path) -> None:
    path = tmp_path / "limits.toml"
    limits = Limits(max_changes=3, locks=(ItemLock("é", "never", reason='"quoted"\n'),))
    write_limits(path, limits)
    assert read_limits(path) == limits
    path.write_bytes(b"\xef\xbb\xbf" + path.read_bytes())
    assert read_limits(path) == limits
    path.write_bytes(b'goal = "\xff"')
    with pytest.raises(CallError, match="UTF-8"):
        read_limits(path)
    with pytest.raises(CallError, match="cannot be read"):
        read_limits(tmp_path / "none.toml")
    with path.open("wb") as file:
        file.truncate(11 * 2**20)
    with pytest.raises(CallError, match="at most"):
        read_limits(path)
