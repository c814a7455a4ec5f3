"""One small category, loaded and fitted once."""

from __future__ import annotations

from pathlib import Path

import pytest

from planner.base.progress import NoProgress
from planner.review import engine
from planner.review.jobs import FitDone, FitJob
from planner.review.review import RangeReview
from planner.sales.report import LoadedData
from tests.review.small import write_folder


@pytest.fixture(scope="session")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The small category's files."""
    return write_folder(tmp_path_factory.mktemp("small"))


@pytest.fixture(scope="session")
def loaded(folder: Path) -> LoadedData:
    return engine.run_load_folder(folder, NoProgress())


@pytest.fixture(scope="session")
def fit(loaded: LoadedData) -> FitDone:
    return engine.run_fit(FitJob(loaded, draws=40), NoProgress())


@pytest.fixture
def review(loaded: LoadedData, fit: FitDone) -> RangeReview:
    """A review with data and fit, nothing done yet."""
    new = RangeReview()
    new.accept_loaded(loaded)
    new.accept_fitted(fit)
    return new
