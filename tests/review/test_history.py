"""Any sequence of commands, fully undone, gives the first state back; redone, the last one."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.base.errors import CallError
from planner.plan.limits import ClusterLimit, Limits
from planner.review.history import MOST_STEPS, History, Snapshot
from planner.review.review import RangeReview
from planner.sales.report import LoadedData

ITEMS = ("0011", "0014", "0022", "0023", "0090")
CLUSTERS = ("", "North", "South")

Command = Callable[[RangeReview], object]

item, cluster = st.sampled_from(ITEMS), st.sampled_from(CLUSTERS)
name = st.sampled_from(("one", "two", "three"))


def _states(seed: int) -> Command:
    def take(review: RangeReview) -> object:
        shape = review.today_states().shape
        return review.take_states(
            np.random.default_rng(seed).integers(0, 2, shape).astype(np.int8), f"Take {seed}"
        )

    return take


commands: st.SearchStrategy[Command] = st.one_of(
    st.builds(lambda i, c: lambda r: r.toggle(i, c), item, cluster),
    st.builds(lambda i, c, s: lambda r: r.set_state(i, c, s), item, cluster, st.integers(0, 2)),
    st.builds(
        lambda i, k, c: lambda r: r.set_lock(i, k, c),
        item,
        st.sampled_from(("keep", "never", "as today", None)),
        cluster,
    ),
    st.builds(
        lambda n, c: lambda r: r.set_limits(Limits(max_changes=n, clusters=(ClusterLimit(c, max_items=n),))),
        st.integers(0, 9),
        st.sampled_from(CLUSTERS[1:]),
    ),
    st.builds(_states, st.integers(0, 5)),
    st.just(lambda r: r.back_to_today()),
    st.builds(lambda n: lambda r: r.keep_plan(n, r.states), name),
    st.builds(lambda n: lambda r: r.drop_plan(n), name),
    st.builds(lambda i, c, w: lambda r: r.set_reason(i, c, w), item, cluster, st.text(max_size=5)),
    st.just(lambda r: r.undo()),
    st.just(lambda r: r.redo()),
)


def picture(review: RangeReview) -> tuple[Any, ...]:
    """Everything commands edit, by value; kept plans without the time they were made."""
    states = review.states
    assert states is not None
    plans = tuple((p.name, p.states.tobytes(), p.limits, p.reasons, p.created) for p in review.plans)
    return states.tobytes(), review.limits, plans, review.reasons


@settings(max_examples=120)
@given(steps=st.lists(commands, max_size=25))
def test_fully_undone_is_the_first_and_fully_redone_the_last_state(
    loaded: LoadedData, steps: list[Command]
) -> None:
    review = RangeReview()
    review.accept_loaded(loaded)
    first = picture(review)
    for step in steps:
        before = picture(review)
        try:
            step(review)
        except CallError:
            assert picture(review) == before
    # What was undone in between is done again first, so that the last state is known.
    while review.can_redo:
        review.redo()
    last = picture(review)
    trail = [last]
    while review.can_undo:
        review.undo()
        trail.append(picture(review))
    assert trail[-1] == first
    for expected in reversed(trail[:-1]):
        review.redo()
        assert picture(review) == expected
    assert picture(review) == last


def test_the_oldest_steps_are_forgotten() -> None:
    history = History()
    for number in range(MOST_STEPS + 10):
        history.do(str(number), Snapshot(reasons=(("item", "", str(number)),)))
    while history.past:
        history.undo()
    assert history.present.reasons == (("item", "", "9"),)
    assert len(history.future) == MOST_STEPS
