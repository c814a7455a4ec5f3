"""One ordinary week's demand in every store, as a function of what is on the shelf.

This is what every what-if, transfer and optimisation uses; the fitted model
produces it (the estimate with K = 1, parameter draws with K > 1).
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True)
class ShelfParts:
    """The pieces of one evaluation.

    shelf (K, S, J): attractions on the shelf.  total (K, S, G): D.
    ratio (K, S, G): D ** (lambda_g / lambda_c) / D, 0 where D is 0.
    inclusive (K, S): W.  category (K, S): q, units per week.
    """

    shelf: Floats
    total: Floats
    ratio: Floats
    inclusive: Floats
    category: Floats


@dataclass(frozen=True)
class StoreDemand:
    """Nested demand (McFadden 1978) per store; plain logit when all dissimilarities are 1.

    attraction (K, C, J): v_cj = exp(delta_cj / lambda_g), delta without the common term.
    dissimilarity (K, G): lambda_g, 0 < lambda_g <= lambda_c.
    category_dissimilarity (K,): lambda_c in (0, 1].
    scale (K, S): exp(c_s), the store's common term (without shoppers: units per week).
    segment (J,), cluster (S,): positions.
    shoppers (S,): per week; None: volume form q = scale * W ** lambda_c.
    price_effect (K, G): effect of ln(regular price) on the scaled utility delta / lambda_g.

        D_sg = sum_j present_sj v_cj              W_s = sum_g D_sg ** (lambda_g / lambda_c)
        q_s  = scale_s W_s ** lambda_c            without shoppers
        q_s  = N_s u / (1 + u), u = scale_s W_s ** lambda_c   with shoppers
        units_sj = q_s * D_sg ** (lambda_g / lambda_c) / W_s * present_sj v_cj / D_sg
    """

    attraction: Floats
    dissimilarity: Floats
    category_dissimilarity: Floats
    scale: Floats
    segment: Ints
    cluster: Ints
    shoppers: Floats | None
    price_effect: Floats = field(default_factory=lambda: np.zeros((1, 1)))

    @property
    def n_draws(self) -> int:
        """K."""
        return int(self.attraction.shape[0])

    def power(self) -> Floats:
        """lambda_g / lambda_c, (K, G)."""
        return self.dissimilarity / self.category_dissimilarity[:, None]

    def category_of(self, inclusive: Floats) -> Floats:
        """Category units q (K, S) from W (K, S)."""
        safe = np.where(inclusive > 0.0, inclusive, 1.0)
        volume = self.scale * np.exp(self.category_dissimilarity[:, None] * np.log(safe))
        volume = np.where(inclusive > 0.0, volume, 0.0)
        if self.shoppers is None:
            return volume
        return self.shoppers * volume / (1.0 + volume)

    def with_prices(self, ratio: Floats) -> StoreDemand:
        """The same demand at other regular prices: ``ratio`` (C, J) = new price / today's."""
        slope = np.broadcast_to(self.price_effect, self.dissimilarity.shape)[:, self.segment]
        return replace(self, attraction=self.attraction * np.exp(slope[:, None, :] * np.log(ratio)))

    def parts(self, present: NDArray[np.bool_] | Floats) -> ShelfParts:
        """Everything between the shelf and the category for ``present`` (S, J), 0..1."""
        shelf = self.attraction[:, self.cluster, :] * np.asarray(present, dtype=np.float64)
        membership = np.zeros((self.segment.size, self.dissimilarity.shape[1]))
        membership[np.arange(self.segment.size), self.segment] = 1.0
        total = shelf @ membership
        safe = np.where(total > 0.0, total, 1.0)
        ratio = np.where(total > 0.0, np.exp((self.power()[:, None, :] - 1.0) * np.log(safe)), 0.0)
        inclusive = (total * ratio).sum(axis=2)
        return ShelfParts(shelf, total, ratio, inclusive, self.category_of(inclusive))

    def units(self, present: NDArray[np.bool_] | Floats) -> Floats:
        """Units per week (K, S, J) when ``present`` (S, J), 0..1, is on the shelf."""
        parts = self.parts(present)
        per_attraction = parts.category / np.where(parts.inclusive > 0.0, parts.inclusive, 1.0)
        weight = parts.ratio * per_attraction[:, :, None]
        return parts.shelf * weight[:, :, self.segment]

    def category_units(self, present: NDArray[np.bool_] | Floats) -> Floats:
        """Category units per week (K, S)."""
        return self.parts(present).category
