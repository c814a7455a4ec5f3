"""One demo per session in full, one small one to look into closely."""

from __future__ import annotations

import pytest

from demo_catalog.generate import Demo, DemoSettings, build


@pytest.fixture(scope="session")
def demo() -> Demo:
    """The committed catalogue, built anew."""
    return build(DemoSettings())


@pytest.fixture(scope="session")
def small() -> Demo:
    """Another seed with few households."""
    return build(DemoSettings(seed=21, households=(90, 120, 150)))
