"""One ordinary week's demand in every store, as a function of what is on the shelf.

This is what every what-if, transfer and optimisation uses; the fitted model
produces it (the estimate with K = 1, parameter draws with K > 1).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True)
class StoreDemand:
    """Nested demand (McFadden 1978) per store; plain logit when all dissimilarities are 1.

    attraction (K, C, J): v_cj = exp(delta_cj / lambda_g), delta without the common term.
    dissimilarity (K, G): lambda_g, 0 < lambda_g <= lambda_c.
    category_dissimilarity (K,): lambda_c in (0, 1].
    scale (K, S): exp(c_s), the store's common term (without shoppers: units per week).
    segment (J,), cluster (S,): positions.
    shoppers (S,): per week; None: volume form q = scale * W ** lambda_c.

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

    @property
    def n_draws(self) -> int:
        """K."""
        return self.attraction.shape[0]

    def _segments(self, present: Floats) -> tuple[Floats, Floats, Floats]:
        """Attractions on the shelf (K, S, J), D (K, S, G) and D^(lambda_g/lambda_c)/D (K, S, G)."""
        shelf = self.attraction[:, self.cluster, :] * present
        n_segments = self.dissimilarity.shape[1]
        membership = np.zeros((self.segment.size, n_segments))
        membership[np.arange(self.segment.size), self.segment] = 1.0
        total = shelf @ membership
        power = self.dissimilarity / self.category_dissimilarity[:, None] - 1.0
        safe = np.where(total > 0.0, total, 1.0)
        ratio = np.where(total > 0.0, np.exp(power[:, None, :] * np.log(safe)), 0.0)
        return shelf, total, ratio

    def _category(self, inclusive: Floats) -> Floats:
        """Category units (K, S) from W (K, S)."""
        safe = np.where(inclusive > 0.0, inclusive, 1.0)
        volume = self.scale * np.exp(self.category_dissimilarity[:, None] * np.log(safe))
        volume = np.where(inclusive > 0.0, volume, 0.0)
        if self.shoppers is None:
            return volume
        return self.shoppers * volume / (1.0 + volume)

    def units(self, present: NDArray[np.bool_] | Floats) -> Floats:
        """Units per week (K, S, J) when ``present`` (S, J), 0..1, is on the shelf."""
        shelf, total, ratio = self._segments(np.asarray(present, dtype=np.float64))
        inclusive = (total * ratio).sum(axis=2)
        category = self._category(inclusive)
        per_attraction = category / np.where(inclusive > 0.0, inclusive, 1.0)
        return shelf * ratio[:, :, self.segment] * per_attraction[:, :, None]

    def category_units(self, present: NDArray[np.bool_] | Floats) -> Floats:
        """Category units per week (K, S)."""
        _, total, ratio = self._segments(np.asarray(present, dtype=np.float64))
        return self._category((total * ratio).sum(axis=2))
