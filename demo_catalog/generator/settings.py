"""What is generated: sizes, dates and strengths."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date, timedelta


@dataclass(frozen=True)
class DemoSettings:
    """One invented history.

    seed: every random number follows from it.
    first_week: Monday of the first of ``weeks`` weeks.
    households: buyers of the category per store, by store size (small, medium, large).
    need_rate: mean needs per household and week; need_shape: of their gamma spread.
    considered: most items a household considers for one kind of need.
    tolerance: (least, shape, scale) of how far below its favourite a household still accepts an item.
    review_weeks: first week of the two range reviews.
    cluster_delay, size_delay: weeks later by cluster (first review) and by store size (second review).
    stock_out: chance that an item starts to run out in a store in a week.
    refits: stores whose shelf grew or shrank by one bay at some time.
    ordinary_weeks: the last weeks whose mean season makes up the ordinary week of the truth.
    """

    seed: int = 7
    first_week: date = date(2024, 12, 2)
    weeks: int = 78
    households: tuple[int, int, int] = (900, 1300, 1800)
    need_rate: float = 0.17
    need_shape: float = 1.3
    considered: int = 24
    tolerance: tuple[float, float, float] = (1.2, 1.6, 1.8)
    review_weeks: tuple[int, int] = (25, 50)
    cluster_delay: tuple[int, int, int] = (0, 3, 6)
    size_delay: tuple[int, int, int] = (5, 2, 0)
    stock_out: float = 0.045
    refits: int = 12
    ordinary_weeks: int = 13

    def monday(self, week: int) -> date:
        """Monday of week number ``week`` (0 = first)."""
        return self.first_week + timedelta(weeks=week)
