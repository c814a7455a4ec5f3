"""The plan file of an open review: what comes back, who holds it."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from planner.base.errors import CallError, PlanFileError
from planner.plan.limits import Limits
from planner.review import engine
from planner.review.carry_over import kept_reasons
from planner.review.review import RangeReview


def test_everything_comes_back(review: RangeReview, tmp_path: Path) -> None:
    path = tmp_path / "a.rangewright"
    review.toggle("0012")
    review.set_limits(Limits(max_changes=3))
    review.set_reason("0012", "", "slow = sold 3 a week")
    review.keep_plan("first", review.current_plan("").states)
    review.toggle("0013")
    assert review.dirty
    assert review.save(path).kinds == {"file"}
    assert (review.dirty, review.path) == (False, path)
    assert review.can_undo
    review.close()
    other = RangeReview()
    other.open(path)
    assert (other.dirty, other.can_undo, other.path) == (False, False, path)
    assert other.limits == review.limits
    assert other.reasons == (("0012", "", "slow = sold 3 a week"),)
    np.testing.assert_array_equal(other.states, review.states)
    np.testing.assert_array_equal(other.plan("first").states, review.plan("first").states)
    assert other.tally().margin == review.tally().margin
    other.close()


def test_an_open_plan_is_held_and_let_go(review: RangeReview, tmp_path: Path) -> None:
    path = tmp_path / "a.rangewright"
    review.save(path)
    other = RangeReview()
    with pytest.raises(CallError, match="another copy"):
        other.open(path)
    assert other.path is None
    review.save(tmp_path / "b.rangewright")
    other.open(path)
    with pytest.raises(CallError, match="another copy"):
        review.open(path)
    # A refused file leaves the present one held.
    assert review.path == tmp_path / "b.rangewright"
    with pytest.raises(CallError, match="another copy"):
        other.save(tmp_path / "b.rangewright")
    other.new()
    review.open(path)
    review.close()
    assert sorted(p.name for p in tmp_path.iterdir()) == ["a.rangewright", "b.rangewright"]


def test_the_same_file_under_another_name_is_the_same(
    review: RangeReview, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    review.save(tmp_path / "a.rangewright")
    monkeypatch.chdir(tmp_path)
    review.save(Path("a.rangewright"))
    review.open(Path("a.rangewright"))
    assert review.path == tmp_path / "a.rangewright"
    review.close()


def test_a_file_that_cannot_be_read_leaves_the_review_as_it_was(review: RangeReview, tmp_path: Path) -> None:
    broken = tmp_path / "broken.rangewright"
    broken.write_bytes(b"something else")
    review.toggle("0012")
    for path in (broken, tmp_path / "missing.rangewright"):
        with pytest.raises(PlanFileError):
            review.open(path)
    assert review.can_undo
    assert review.path is None
    assert [p.name for p in tmp_path.iterdir()] == ["broken.rangewright"]


def test_a_failed_save_keeps_the_present_file(review: RangeReview, tmp_path: Path) -> None:
    with pytest.raises(CallError, match="no file yet"):
        review.save()
    review.save(tmp_path / "a.rangewright")
    foreign = tmp_path / "letter.rangewright"
    foreign.write_bytes(b"Dear reader, this is no plan.")
    review.toggle("0012")
    with pytest.raises(PlanFileError):
        review.save(foreign)
    assert (review.path, review.dirty) == (tmp_path / "a.rangewright", True)
    assert foreign.read_bytes().startswith(b"Dear")
    review.save()
    assert not review.dirty
    review.close()


def test_set_aside_rows_are_written(review: RangeReview, tmp_path: Path) -> None:
    path = tmp_path / "aside.csv"
    engine.write_set_aside(path, review.need_loaded())
    assert path.read_text(encoding="utf-8").startswith("file,row,reason")
    with pytest.raises(CallError):
        engine.write_set_aside(tmp_path / "aside.xlsx", review.need_loaded())


@pytest.mark.parametrize("reasons", [5, "text", [["a", "b"]], [["a", "b", 3]], [5], {"a": 1}])
def test_reasons_of_another_kind_are_damage(reasons: object) -> None:
    with pytest.raises(PlanFileError, match="reasons"):
        kept_reasons({"reasons": reasons}, Path("a.rangewright"))


def test_reasons_as_lists_and_tuples_are_read() -> None:
    assert kept_reasons({"reasons": [["a", "", "b"]]}, Path("x")) == (("a", "", "b"),)
    assert kept_reasons({"reasons": (("a", "", "b"),)}, Path("x")) == (("a", "", "b"),)
    assert kept_reasons({}, Path("x")) == ()
