"""Tests of proportional switching against published and recomputed values.

Marks: [V-mem] recomputed, the printed number from memory; [V-1] recomputed by one route,
[V-2] by two.
"""

import numpy as np
import pytest

from planner.demand.choices import ChoiceData
from planner.demand.switching import hausman_mcfadden, nest_score, omitted_variable, small_hsiao
from tests.published.data import from_wide, table
from tests.published.test_estimates import MODES, YOGURT, travel_mode, yogurt

CATSUP = ["heinz41", "heinz28", "heinz32", "hunts32"]


def catsup() -> ChoiceData:
    return from_wide(table("Ecdat", "Catsup"), "choice", CATSUP, ["disp", "feat", "price"])


def only(items: list[str], removed: str) -> np.ndarray:
    return np.array([item == removed for item in items])


def test_hausman_mcfadden_on_travel_mode_without_air():
    """[V-mem] Hausman & McFadden 1984; Greene prints 33.3363 (memory), recomputed 33.3367."""
    test = hausman_mcfadden(travel_mode([0, 0, 0, 0]), 3, only(MODES, "air"))
    assert test.statistic == pytest.approx(33.3367, abs=1e-2)
    assert test.degrees == 4
    assert test.p_value == pytest.approx(1.02e-6, abs=1e-8)


def test_hausman_mcfadden_awkward_cases_are_not_usable():
    """[V-1; air, train, bus repeated with statsmodels] Same data: negative or indefinite cases."""
    data = travel_mode([0, 0, 0, 0])
    bus = hausman_mcfadden(data, 3, only(MODES, "bus"))
    assert bus.statistic == pytest.approx(123.198, abs=1e-2)
    train = hausman_mcfadden(data, 3, only(MODES, "train"))
    assert train.usable
    assert (train.statistic, train.degrees) == (pytest.approx(30.5175, abs=1e-3), 5)
    car = hausman_mcfadden(data, 3, only(MODES, "car"))
    yoplait = hausman_mcfadden(yogurt(), 3, only(YOGURT, "yoplait"))
    assert car.statistic < 0.0
    assert yoplait.statistic == pytest.approx(-48.74, abs=0.05)
    for test in (bus, car, yoplait):
        assert not test.usable
        assert test.p_value is None
        assert "not positive definite" in test.why


@pytest.mark.parametrize(
    ("data", "items", "base", "removed", "statistic", "degrees"),
    [
        (yogurt, YOGURT, 3, "dannon", 12.5339, 4),
        (yogurt, YOGURT, 3, "weight", 15.9978, 4),
        (catsup, CATSUP, 3, "heinz41", 18.0714, 5),
        (catsup, CATSUP, 3, "heinz28", 32.4691, 5),
        (catsup, CATSUP, 3, "heinz32", 122.3351, 5),
        # The base item goes: only the shared coefficients are compared.
        (yogurt, YOGURT, 3, "hiland", 20.1822, 2),
        (catsup, CATSUP, 3, "hunts32", 98.1753, 3),
    ],
)
def test_hausman_mcfadden_on_scanner_panels(data, items, base, removed, statistic, degrees):
    """[V-1; yogurt lines repeated with statsmodels] Ecdat::Yogurt and Ecdat::Catsup."""
    test = hausman_mcfadden(data(), base, only(items, removed))
    assert test.usable
    assert test.statistic == pytest.approx(statistic, abs=1e-3)
    assert test.degrees == degrees


def test_score_and_omitted_variable_tests_of_a_ground_nest():
    """[V-1] Score 7.852629 and 5.123253; McFadden 1987 (J. Econometrics 35): Wald 7.3938, LR 7.7474."""
    data = travel_mode([0, 0, 0, 0])
    expected, outer = nest_score(data, 3, np.array([0, 1, 1, 1]))
    assert expected.statistic == pytest.approx(7.852629, abs=1e-3)
    assert outer.statistic == pytest.approx(5.123253, abs=1e-3)
    wald, ratio = omitted_variable(data, 3, np.array([False, True, True, True]))
    assert wald.statistic == pytest.approx(7.3938, abs=1e-3)
    assert ratio.statistic == pytest.approx(7.7474, abs=1e-3)
    for test in (expected, outer, wald, ratio):
        assert test.degrees == 1
        assert test.p_value < 0.05


def test_small_hsiao_with_a_fixed_split():
    """[V-1] Small & Hsiao 1985 (Int. Econ. Rev. 26): halves are odd and even traveller numbers."""
    data = travel_mode([0, 0, 0, 0])
    odd = np.arange(210) % 2 == 0
    removed = only(MODES, "air")
    test = small_hsiao(data, 3, removed, odd)
    assert (test.statistic, test.degrees) == (pytest.approx(27.309392, abs=1e-3), 4)
    assert small_hsiao(data, 3, removed, ~odd).statistic == pytest.approx(14.891521, abs=1e-3)
