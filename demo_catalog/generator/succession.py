"""The one pack that was resized under a new code."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from demo_catalog.generator.lists import SUCCESSION, ItemFacts, key_of
from demo_catalog.generator.settings import DemoSettings


@dataclass(frozen=True)
class Succession:
    """An old code's item, and the week (S,) in which each store changes to the new one."""

    item: int
    old_code: str
    old_bags: int
    week: NDArray[np.int64]

    def spare(self, items: tuple[ItemFacts, ...], week: int) -> NDArray[np.float64]:
        """How much longer than a pack of today one of that week lasts, in packs, (S, J)."""
        longer = np.zeros((self.week.size, len(items)))
        longer[week < self.week, self.item] = self.old_bags / items[self.item].bags - 1.0
        return longer

    def code(self, items: tuple[ItemFacts, ...], week: int, store: int, item: int) -> str:
        """The code an item was sold under."""
        return self.old_code if item == self.item and week < self.week[store] else items[item].code


def draw_succession(
    items: tuple[ItemFacts, ...], n_stores: int, settings: DemoSettings, rng: np.random.Generator
) -> Succession:
    """When the resized pack replaced the old one, store by store within three weeks."""
    key, old_bags = SUCCESSION
    item = next(j for j, fact in enumerate(items) if key_of(fact) == key)
    first = settings.weeks // 2 + 2
    return Succession(
        item, f"{int(items[item].code) - 16:07d}", old_bags, first + rng.integers(0, 3, n_stores)
    )
