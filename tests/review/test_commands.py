"""Commands of the open review: what they change, what they say, what they refuse."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from planner.base.errors import CallError
from planner.plan.limits import ClusterLimit, ItemLock, Limits
from planner.review.changes import KINDS, Change
from planner.review.review import RangeReview
from planner.sales.report import LoadedData
from planner.transfer.what_if import AS_TODAY, IN, OUT

PARTLY, OFFER, PLAIN = "0014", "0090", "0012"


def state_of(review: RangeReview, item: str, cluster: str) -> int:
    loaded = review.need_loaded()
    states = review.states
    assert states is not None
    return int(states[loaded.catalogue.clusters.index(cluster), loaded.catalogue.item_index()[item]])


def test_a_new_review_holds_nothing_and_says_what_is_missing() -> None:
    review = RangeReview()
    assert (review.loaded, review.fitted, review.states, review.path) == (None, None, None, None)
    assert not (review.can_undo)
    assert not (review.can_redo)
    assert not (review.dirty)
    with pytest.raises(CallError, match="loaded"):
        review.toggle(PLAIN)
    with pytest.raises(CallError):
        review.undo()
    with pytest.raises(CallError):
        review.redo()


def test_data_without_a_fit(loaded: LoadedData) -> None:
    review = RangeReview()
    change = review.accept_loaded(loaded)
    assert change.kinds == KINDS - {"file"}
    review.toggle(PLAIN)
    assert review.table("bench").n_rows == len(loaded.catalogue.items)
    assert review.words("evidence") == ()
    with pytest.raises(CallError, match="fit"):
        review.tally()


def test_toggle_takes_off_every_list_and_back(review: RangeReview) -> None:
    change = review.toggle(PLAIN)
    assert change == Change(frozenset({"states", "history"}), change.label, (PLAIN,))
    assert [state_of(review, PLAIN, c) for c in ("North", "South")] == [OUT, OUT]
    review.toggle(PLAIN)
    assert (review.states == review.today_states()).all()


def test_toggle_in_one_cluster(review: RangeReview) -> None:
    review.toggle(PLAIN, "North")
    assert state_of(review, PLAIN, "North") == OUT
    assert state_of(review, PLAIN, "South") == IN


def test_a_partly_listed_item_goes_out_and_back_to_as_today(review: RangeReview) -> None:
    assert state_of(review, PARTLY, "North") == AS_TODAY
    review.toggle(PARTLY)
    assert state_of(review, PARTLY, "North") == OUT
    review.toggle(PARTLY)
    assert state_of(review, PARTLY, "North") == AS_TODAY
    review.set_state(PARTLY, "North", IN)
    assert state_of(review, PARTLY, "North") == IN
    assert state_of(review, PARTLY, "South") == AS_TODAY
    review.set_state(PARTLY, "", AS_TODAY)
    assert (review.states == review.today_states()).all()


def test_an_offer_is_listed_only_where_it_is_offered(review: RangeReview) -> None:
    review.toggle(OFFER)
    assert [state_of(review, OFFER, c) for c in ("North", "South")] == [IN, OUT]
    review.toggle(OFFER)
    assert [state_of(review, OFFER, c) for c in ("North", "South")] == [OUT, OUT]
    for refused in (lambda: review.toggle(OFFER, "South"), lambda: review.set_state(OFFER, "South", IN)):
        with pytest.raises(CallError, match="North"):
            refused()
    review.set_state(OFFER, "", IN)
    assert [state_of(review, OFFER, c) for c in ("North", "South")] == [IN, OUT]


def test_as_today_means_todays_state_where_nothing_is_partly_listed(review: RangeReview) -> None:
    review.toggle(PLAIN)
    review.set_state(PLAIN, "North", AS_TODAY)
    assert state_of(review, PLAIN, "North") == IN
    review.set_state(OFFER, "North", AS_TODAY)
    assert state_of(review, OFFER, "North") == OUT


@pytest.mark.parametrize(
    ("item", "cluster", "words"), [("12", "", "12"), ("0012", "West", "North, South"), ("", "", "item")]
)
def test_unknown_codes_are_refused_and_change_nothing(
    review: RangeReview, item: str, cluster: str, words: str
) -> None:
    for command in (
        lambda: review.toggle(item, cluster),
        lambda: review.set_state(item, cluster, OUT),
        lambda: review.set_lock(item, "keep", cluster),
    ):
        with pytest.raises(CallError) as caught:
            command()
        assert words in str(caught.value)
    assert not review.can_undo


def test_locks_replace_each_other_and_go(review: RangeReview) -> None:
    review.set_lock(PLAIN, "keep", reason="promised")
    review.set_lock(PLAIN, "never", "North")
    assert review.limits.locks == (
        ItemLock(PLAIN, "keep", "", "promised"),
        ItemLock(PLAIN, "never", "North"),
    )
    review.set_lock(PLAIN, "as today")
    review.set_lock(PLAIN, None, "North")
    assert review.limits.locks == (ItemLock(PLAIN, "as today"),)
    with pytest.raises(CallError, match="maybe"):
        review.set_lock(PLAIN, "maybe")


@pytest.mark.parametrize(
    "limits",
    [
        Limits(locks=(ItemLock("12", "keep"),)),
        Limits(locks=(ItemLock(PLAIN, "perhaps"),)),
        Limits(locks=(ItemLock(PLAIN, "keep", "West"),)),
        Limits(clusters=(ClusterLimit("West", space=10.0),)),
        Limits(clusters=(ClusterLimit("", space=10.0),)),
    ],
)
def test_limits_of_unknown_codes_are_refused(review: RangeReview, limits: Limits) -> None:
    with pytest.raises(CallError):
        review.set_limits(limits)
    assert review.limits == Limits()


def test_states_of_another_shape_are_refused(review: RangeReview) -> None:
    with pytest.raises(CallError, match="other data"):
        review.take_states(np.zeros((2, 3), dtype=np.int8), "Take")


def test_kept_plans(review: RangeReview) -> None:
    states = review.states
    assert states is not None
    with pytest.raises(CallError, match="No plan is kept"):
        review.plan()
    review.set_reason(PLAIN, "", "slow")
    review.keep_plan(" first ", states)
    review.toggle(PLAIN)
    review.keep_plan("second", review.current_plan("").states)
    assert [plan.name for plan in review.plans] == ["first", "second"]
    assert review.plan().name == "second"
    assert review.plan("first").reasons == ((PLAIN, "", "slow"),)
    review.keep_plan("first", review.current_plan("").states)
    assert [plan.name for plan in review.plans] == ["second", "first"]
    review.drop_plan("second")
    assert [plan.name for plan in review.plans] == ["first"]
    for refused in (lambda: review.plan("third"), lambda: review.drop_plan("third")):
        with pytest.raises(CallError, match="first"):
            refused()
    with pytest.raises(CallError, match="name"):
        review.keep_plan("  ", states)


def test_kept_states_are_a_copy(review: RangeReview) -> None:
    mine = review.today_states()
    review.keep_plan("first", mine)
    review.take_states(mine, "Take")
    mine[:] = OUT
    assert (review.plan().states == review.today_states()).all()
    assert (review.states == review.today_states()).all()


def test_reasons_are_written_and_taken_away(review: RangeReview) -> None:
    review.set_reason(PLAIN, "North", "too slow")
    review.set_reason(PLAIN, "North", "much too slow")
    assert review.reasons == ((PLAIN, "North", "much too slow"),)
    assert "much too slow" in review.table("items").column("reason").values
    review.set_reason(PLAIN, "North", " ")
    assert review.reasons == ()


def test_undo_and_redo_say_what_changed(review: RangeReview) -> None:
    review.toggle(PLAIN)
    review.set_lock(PLAIN, "keep")
    assert PLAIN in review.undo_label
    heard: list[Change] = []
    review.subscribe(heard.append)
    assert review.undo().kinds == {"limits", "history"}
    assert review.undo().kinds == {"states", "history"}
    assert not review.can_undo
    assert review.redo().kinds == {"states", "history"}
    assert [change.kinds - {"history"} for change in heard] == [{"limits"}, {"states"}, {"states"}]
    # A new command forgets what was undone.
    review.back_to_today()
    assert not review.can_redo
    assert review.redo_label == ""


def test_new_data_keep_what_still_fits(review: RangeReview, loaded: LoadedData) -> None:
    limits = Limits(
        max_changes=4,
        clusters=(ClusterLimit("North", max_items=9),),
        locks=(ItemLock(PLAIN, "keep"), ItemLock(OFFER, "never")),
    )
    review.set_limits(limits)
    review.toggle(PARTLY)
    review.keep_plan("first", review.current_plan("").states)
    change = review.accept_loaded(loaded)
    assert change.label == "Load sales"
    assert review.fitted is None
    assert (review.states == review.today_states()).all()
    assert review.limits == limits
    assert review.plan().outcome is None
    assert not review.can_undo
    # Without the offer its lock and the plans of other items cannot stay, and that is said.
    catalogue = replace(loaded.catalogue, items=loaded.catalogue.items[:-1])
    fewer = replace(loaded, catalogue=catalogue, base=replace(loaded.base, today=loaded.base.today[:, :-1]))
    change = review.accept_loaded(fewer)
    assert review.limits.locks == (ItemLock(PLAIN, "keep"),)
    assert review.limits.max_changes == 4
    assert review.plans == ()
    assert "1 kept plan" in change.label
    assert "1 limit" in change.label


def test_new_forgets_everything(review: RangeReview) -> None:
    review.toggle(PLAIN)
    review.new()
    assert (review.loaded, review.fitted, review.states) == (None, None, None)
    assert not (review.dirty)
    assert not (review.can_undo)
