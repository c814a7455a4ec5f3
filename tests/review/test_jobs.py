"""Jobs: picklable, done in a child process or directly, with the same results."""

from __future__ import annotations

import pickle
import time
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from planner.base.errors import CallError, DataError, LimitsError
from planner.base.progress import NoProgress
from planner.base.runner import ChildRunner, Message
from planner.plan.limits import ClusterLimit, Limits
from planner.plan.plans import NamedPlan
from planner.review import engine
from planner.review.jobs import ExportJob, FitDone, FitJob, LoadJob, RecommendJob, load_request
from planner.review.review import RangeReview
from planner.sales.report import LoadedData

PATIENCE = 60.0


def until_last(runner: ChildRunner) -> list[Message]:
    messages: list[Message] = []
    until = time.monotonic() + PATIENCE
    while runner.busy and time.monotonic() < until:
        messages += runner.poll()
        time.sleep(0.005)
    assert not runner.busy
    return messages


def recommend(loaded: LoadedData, fit: FitDone, limits: Limits = Limits()) -> NamedPlan:  # noqa: B008
    return engine.run_recommend(RecommendJob(loaded, fit.fitted, limits, "best", 20.0), NoProgress())


def test_requests(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(folder)
    request = load_request({"sales": Path("sales.csv"), "items": Path("items.csv"), "stores": None})
    assert request.sales == folder / "sales.csv"
    assert request.stores is None
    assert engine.request_from_folder(Path(".")).request.offers == folder / "offers.csv"
    with pytest.raises(CallError, match="items"):
        load_request({"sales": Path("sales.csv"), "items": None})


def test_the_whole_review_in_the_child(folder: Path, tmp_path: Path) -> None:
    """What the window does: load, fit, recommend, export, one job after another in one child."""
    runner, review = ChildRunner("planner.review.engine:warm_up"), RangeReview()

    def done(target: str, *arguments: object) -> Message:
        runner.start(f"planner.review.engine:{target}", arguments)
        messages = until_last(runner)
        assert messages[-1].kind == "done", messages[-1].error
        return messages[-1]

    try:
        review.accept_loaded(done("run_load_folder", folder).result)
        child = runner.process_id
        review.accept_fitted(done("run_fit", FitJob(review.need_loaded(), draws=40)).result)
        loaded, fitted = review.need_loaded(), review.need_fitted()
        plan = done("run_recommend", RecommendJob(loaded, fitted, Limits(max_changes=2), "two")).result
        review.accept_recommended(plan)
        path = tmp_path / "two.xlsx"
        assert done("run_export", ExportJob("workbook", path, loaded, fitted, review.plan())).result == path
        assert path.stat().st_size > 10_000
        assert runner.process_id == child
    finally:
        runner.close()
    assert review.single_tally(plan.states).changes == 2


def test_direct_and_in_the_child_are_the_same(loaded: LoadedData, fit: FitDone) -> None:
    runner = ChildRunner()
    try:
        runner.start("planner.review.engine:run_fit", (FitJob(loaded, draws=40),))
        there = until_last(runner)[-1].result
    finally:
        runner.close()
    np.testing.assert_allclose(there.fitted.draws.attraction, fit.fitted.draws.attraction, rtol=1e-8)
    np.testing.assert_allclose(there.delistings.moved, fit.delistings.moved, rtol=1e-6, atol=1e-9)


def test_a_stopped_search_keeps_its_best(loaded: LoadedData, fit: FitDone) -> None:
    class Stopped(NoProgress):
        def cancelled(self) -> bool:
            return True

    job = RecommendJob(loaded, fit.fitted, Limits(), "best", 20.0, 0.0)
    plan = engine.run_recommend(job, Stopped())
    assert plan.outcome is not None
    assert plan.outcome.value >= plan.outcome.today_value - 1e-9
    assert plan.outcome.bound >= plan.outcome.value


def test_records_cross_the_pipe(loaded: LoadedData, fit: FitDone) -> None:
    job = pickle.loads(pickle.dumps(RecommendJob(loaded, fit.fitted, Limits(), "best")))
    assert job.name == "best"
    np.testing.assert_array_equal(job.fitted.draws.scale, fit.fitted.draws.scale)
    assert pickle.loads(pickle.dumps(LoadJob(loaded.request))).request == loaded.request


def test_a_recommended_plan_is_kept_and_today_stays(
    review: RangeReview, loaded: LoadedData, fit: FitDone
) -> None:
    plan = recommend(loaded, fit)
    assert plan.outcome is not None
    change = review.accept_recommended(plan)
    assert change.kinds == {"plans", "history"}
    assert (review.states == review.today_states()).all()
    tally = review.single_tally(plan.states)
    assert tally.margin.plan == pytest.approx(plan.outcome.value, rel=1e-9)
    assert tally.margin.today == pytest.approx(plan.outcome.today_value, rel=1e-9)
    assert plan.outcome.bound >= plan.outcome.value >= plan.outcome.today_value
    assert (tally.space_used <= tally.space_limit + 1e-6).all()
    review.undo()
    assert review.plans == ()


def test_the_goal_pursued_is_written_into_the_plan(loaded: LoadedData, fit: FitDone) -> None:
    nothing = np.full_like(loaded.base.cost, np.nan)
    costless = replace(loaded.base, cost=nothing, margin=loaded.base.net_price - nothing)
    plan = recommend(replace(loaded, base=costless), fit, Limits(goal="margin"))
    assert plan.limits.goal == "sales"
    assert "No cost is known" in plan.notes


def test_limits_that_clash_are_named(loaded: LoadedData, fit: FitDone) -> None:
    with pytest.raises(LimitsError, match="South") as caught:
        recommend(loaded, fit, Limits(clusters=(ClusterLimit("South", space=20.0, min_items=9),)))
    assert "North" not in caught.value.problem


def test_fitted_again_kept_plans_say_so(review: RangeReview, loaded: LoadedData, fit: FitDone) -> None:
    review.accept_recommended(recommend(loaded, fit, Limits(max_changes=1)))
    states = review.states
    assert states is not None
    review.keep_plan("by hand", states)
    change = review.accept_fitted(fit)
    assert {"fit", "states", "plans"} == change.kinds
    assert "earlier fit" in review.plan("best").notes
    assert review.plan("by hand").notes == ""
    review.accept_fitted(fit.fitted)
    assert review.plan("best").notes.count("earlier fit") == 1
    review.undo()
    assert "earlier fit" in review.plan("best").notes


def test_segments_formed_anew_from_the_same_files(loaded: LoadedData) -> None:
    again = engine.run_load_again(loaded, ("brand",), NoProgress())
    assert again.catalogue.segments == ("Marlind", "Quellin", "Tverrhus", "Österbeck")
    assert again.report.money_used == loaded.report.money_used


def test_segments_are_not_formed_from_changed_files(loaded: LoadedData, tmp_path: Path) -> None:
    for path in loaded.request.sales.parent.iterdir():
        (tmp_path / path.name).write_bytes(path.read_bytes())
    moved = engine.run_load_folder(tmp_path, NoProgress())
    lines = (tmp_path / "sales.csv").read_text(encoding="utf-8").splitlines()
    (tmp_path / "sales.csv").write_text("\n".join(lines[:-1]) + "\n", encoding="utf-8")
    with pytest.raises(DataError, match=r"2,?130|rows") as caught:
        engine.run_load_again(moved, ("brand",), NoProgress())
    assert "changed" in caught.value.remedy


@pytest.mark.parametrize("kind", ["workbook", "report", "stores list"])
def test_exports_are_written(
    kind: str, review: RangeReview, loaded: LoadedData, fit: FitDone, tmp_path: Path
) -> None:
    path = tmp_path / {"workbook": "a.xlsx", "report": "a.pdf", "stores list": "a.csv"}[kind]
    review.toggle("0012")
    job = ExportJob(kind, path, loaded, fit.fitted, review.current_plan("Present plan"))
    assert engine.run_export(job, NoProgress()) == path
    head = path.read_bytes()[:4]
    assert head == {"workbook": b"PK\x03\x04", "report": b"%PDF", "stores list": b"stor"}[kind]


def test_an_unknown_export_is_refused(
    review: RangeReview, loaded: LoadedData, fit: FitDone, tmp_path: Path
) -> None:
    job = ExportJob("poem", tmp_path / "a.txt", loaded, fit.fitted, review.current_plan(""))
    with pytest.raises(CallError, match="poem"):
        engine.run_export(job, NoProgress())
