"""Upper bound of one cluster: column generation over segment combinations.

Per component r, with W = sum_g W_g and Phi = sum_g Phi_g linear in the choice of one combination
per segment, R = q(W) / W x Phi is overestimated on the box of W and T = Phi - mu W by

    R <= top q(W) + k_low (Phi - top W)             top: largest margin, k = q / W >= k_low
    R <= mu q(W) + [k_high T + T_low k(W) - k_high T_low]     (McCormick 1976 on T k)
    R <= mu q(W) + [k_low T + T_high k(W) - k_low T_high]

exactly for every mu >= 0, with q under its tangents (concave), k over its tangents or under its
chord (convex).  A bound is never the solver's own objective: it is recomputed from the clipped
duals in plain arithmetic (Neumaier & Shcherbina 2004), the best combination of every segment and
the boxes included, so that solver tolerance cannot make it false.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from planner.optimise.components import ClusterModel
from planner.optimise.linear import INFINITY, LinearProgram, LinearStatus
from planner.optimise.subsets import Block

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

_COLUMNS_PER_ROUND = 12
_ROUNDS = 120


@dataclass(frozen=True)
class Box:
    """Ranges (R,) of W and of T = Phi - mu W."""

    low: Floats
    high: Floats
    t_low: Floats
    t_high: Floats
    mu: Floats


@dataclass
class _Rows:
    """Rows over the structural variables (W, Phi, q-cut u, R-cut y), all of the form a x <= b."""

    matrix: list[Floats] = field(default_factory=list)
    right: list[float] = field(default_factory=list)

    def add(self, row: Floats, right: float) -> None:
        self.matrix.append(row)
        self.right.append(right)


@dataclass(frozen=True)
class Bound:
    """value: proven upper bound; reduced: per block an upper bound on every combination's reduced
    cost; tops: per block the largest, exactly.

    chosen: per block the weight of each generated combination {index: weight}.
    """

    value: float
    reduced: list[NDArray[np.float32]]
    tops: list[float]
    chosen: list[dict[int, float]]


def value_box(blocks: list[Block], known: Box) -> Box:
    """``known`` narrowed by the combinations left: sums of each segment's least and largest."""
    n = known.mu.size
    ranges = [block.t_range(known.mu) for block in blocks]

    def total(parts: list[Floats]) -> Floats:
        return np.asarray(np.sum(parts, axis=0), dtype=np.float64)

    return Box(
        np.maximum(total([block.lowest[:n] for block in blocks]), known.low),
        np.minimum(total([block.highest[:n] for block in blocks]), known.high),
        np.maximum(total([low for low, _high in ranges]), known.t_low),
        np.minimum(total([high for _low, high in ranges]), known.t_high),
        known.mu,
    )


def contradictory(box: Box) -> bool:
    """Some range is empty: no combination left can be as good as what proved the ranges."""
    slack = 1e-9
    return bool(
        (box.low > box.high * (1.0 + slack) + 1e-300).any()
        or (box.t_low > box.t_high + slack * (1.0 + np.abs(box.t_high))).any()
    )


def _cut_rows(model: ClusterModel, box: Box, centre: Floats, top: float) -> _Rows:
    """Tangents of q and overestimates of R for every component."""
    n = model.n_components
    rows = _Rows()

    def row(r: int, w: float = 0.0, phi: float = 0.0, u: float = 0.0, y: float = 0.0) -> Floats:
        a = np.zeros(4 * n)
        a[r], a[n + r], a[2 * n + r], a[3 * n + r] = w, phi, u, y
        return a

    q_high, q_low = model.demand(box.high), model.demand(box.low)
    for r in range(n):
        wl, wh, mu = float(box.low[r]), float(box.high[r]), float(box.mu[r])
        if wh <= 0.0:
            rows.add(row(r, y=1.0), 0.0)
            continue
        points = sorted({float(np.clip(centre[r], max(wl, 1e-12 * wh), wh)), max(wl, 1e-3 * wh), wh})
        for point in points:
            at = np.full(n, point)
            q, slope = float(model.demand(at)[r]), float(model.slope(at)[r])
            rows.add(row(r, w=-slope, u=1.0), q - slope * point)
        k_low = float(q_high[r]) / wh
        rows.add(row(r, w=k_low * top, phi=-k_low, u=-top, y=1.0), 0.0)
        if wl <= 1e-9 * wh:
            continue
        k_high = float(q_low[r]) / wl
        for k, t in ((k_high, float(box.t_low[r])), (k_low, float(box.t_high[r]))):
            for a, b in _k_lines(model, r, wl, wh, k_low, k_high, t, float(centre[r])):
                # y <= mu u + k (Phi - mu W) + t (a + b W) - k t
                rows.add(row(r, w=k * mu - t * b, phi=-k, u=-mu, y=1.0), t * a - k * t)
    return rows


def _k_lines(
    model: ClusterModel, r: int, wl: float, wh: float, k_low: float, k_high: float, t: float, centre: float
) -> list[tuple[float, float]]:
    """Lines a + b W with t (a + b W) >= t k(W) on the box: the chord for t >= 0, tangents for t < 0."""
    if t >= 0.0:
        b = (k_low - k_high) / (wh - wl) if wh > wl * (1.0 + 1e-12) else 0.0
        return [(k_high - b * wl, b)]
    lines = []
    for point in (wl, float(np.clip(centre, wl, wh)), wh):
        at = np.full(model.n_components, point)
        q, slope = float(model.demand(at)[r]), float(model.slope(at)[r])
        b = (slope - q / point) / point
        lines.append((q / point - b * point, b))
    return lines


def priced(block: Block, price: Floats) -> tuple[NDArray[np.float32], float]:
    """Upper bounds (n,) on terms x price, and the exact largest of terms x price.

    Single precision finds the candidates; its error is at most a few units in the last place of
    every product, added to the bounds, and the candidates are computed again in double precision.
    """
    error = (price.size + 3) * 1.2e-7 * float(block.largest @ np.abs(price)) + 1e-30
    rough = price.astype(np.float32) @ block.short
    top = float(rough.max())
    candidates = np.flatnonzero(rough >= top - 2.0 * error)
    best = float((price @ block.terms[:, candidates]).max())
    return rough + np.float32(error), best


class Relaxation:
    """The master program of one node; solves for the bound, or for the range of a component's W or T."""

    def __init__(
        self,
        model: ClusterModel,
        blocks: list[Block],
        box: Box,
        centre: Floats,
        changes: int | None,
        at_least: float | None = None,
    ) -> None:
        self.model, self.blocks, self.box = model, blocks, box
        self.n = model.n_components
        top = max(float(model.value[model.allowed[:, 1] | model.allowed[:, 2]].max(initial=0.0)), 0.0)
        cuts = _cut_rows(model, box, centre, top)
        self.cut_matrix, self.cut_right = np.array(cuts.matrix), np.array(cuts.right)
        self._sides(changes)
        self.at_least = at_least
        self._structural_boxes(top)
        self._build()

    def _sides(self, changes: int | None) -> None:
        """Side rows a x <= b over combinations: space, most and least items, changes."""
        most = np.inf if changes is None else float(changes)
        self.side_right = np.array([*self.model.room, self.model.most, -self.model.least, most])
        self.side_right = np.where(np.isfinite(self.side_right), self.side_right, 1e9)

    def _side_of(self, block: Block, picks: Ints) -> Floats:
        """Side columns (rows, n) of some combinations."""
        rows = np.column_stack(
            [block.use[picks], block.count[picks], -block.count[picks], block.changes[picks]]
        )
        return rows.T

    def _structural_boxes(self, top: float) -> None:
        """Finite ranges of (W, Phi, u, y), wide enough for every choice of combinations."""
        box, blocks = self.box, self.blocks
        phi = slice(self.n, 2 * self.n)
        phi_low = np.sum([block.lowest[phi] for block in blocks], axis=0)
        phi_high = np.sum([block.highest[phi] for block in blocks], axis=0)
        q = self.model.demand(box.high)
        worst = float(min(self.model.value.min(), 0.0))
        self.lower = np.concatenate([box.low, phi_low, np.zeros(self.n), worst * q - 1.0])
        self.upper = np.concatenate([box.high, phi_high, q, top * q + 1.0])

    def _build(self) -> None:
        """Rows: links (2R), cuts, sides, one per block, and the value floor when ranges are sought."""
        n, blocks = self.n, self.blocks
        n_cuts, n_sides, n_blocks = len(self.cut_right), self.side_right.size, len(blocks)
        floor = 0 if self.at_least is None else 1
        self.rows = {"link": 0, "cut": 2 * n, "side": 2 * n + n_cuts}
        self.rows["block"] = self.rows["side"] + n_sides
        self.rows["floor"] = self.rows["block"] + n_blocks
        n_rows = self.rows["floor"] + floor
        matrix = np.zeros((n_rows, 4 * n))
        matrix[:n, :n] = np.eye(n)
        matrix[n : 2 * n, n : 2 * n] = np.eye(n)
        matrix[self.rows["cut"] : self.rows["side"]] = self.cut_matrix
        low, high = np.full(n_rows, -INFINITY), np.full(n_rows, INFINITY)
        low[: 2 * n] = high[: 2 * n] = 0.0
        high[self.rows["cut"] : self.rows["side"]] = self.cut_right
        high[self.rows["side"] : self.rows["block"]] = self.side_right
        low[self.rows["block"] : self.rows["floor"]] = high[self.rows["block"] : self.rows["floor"]] = 1.0
        if self.at_least is not None:
            matrix[-1, 3 * n :] = -1.0
            high[-1] = -self.at_least
        cost = np.concatenate([np.zeros(3 * n), np.ones(n)])
        self.objective = cost
        self.program = LinearProgram(cost, self.lower, self.upper, matrix, low, high)
        self.columns: list[tuple[int, int]] = []
        self.known: list[set[int]] = [set() for _ in blocks]
        self._artificials(n_rows)

    def _artificials(self, n_rows: int) -> None:
        """Costly slack on links, sides, blocks and floor, so that the first program has a solution."""
        scale = 1e3 * max(1.0, float(np.abs(self.upper[3 * self.n :]).sum()))
        wanted = [(i, sign) for i in range(2 * self.n) for sign in (1.0, -1.0)]
        wanted += [(self.rows["side"] + i, -1.0) for i in range(self.side_right.size)]
        wanted += [(self.rows["block"] + i, 1.0) for i in range(len(self.blocks))]
        if self.at_least is not None:
            wanted.append((self.rows["floor"], -1.0))
        matrix = np.zeros((n_rows, len(wanted)))
        for k, (i, sign) in enumerate(wanted):
            matrix[i, k] = sign
        self.n_artificial = len(wanted)
        self.penalty = np.full(len(wanted), -scale)
        self.program.add_columns(self.penalty, matrix)

    def add(self, g: int, picks: Ints) -> None:
        """Generate combinations ``picks`` of block g."""
        new = np.array([int(k) for k in picks if int(k) not in self.known[g]], dtype=np.int64)
        if not new.size:
            return
        block = self.blocks[g]
        n_rows = self.rows["floor"] + (0 if self.at_least is None else 1)
        matrix = np.zeros((n_rows, new.size))
        matrix[: self.n] = -block.inclusive[new].T
        matrix[self.n : 2 * self.n] = -block.weighted[new].T
        matrix[self.rows["side"] : self.rows["block"]] = self._side_of(block, new)
        matrix[self.rows["block"] + g] = 1.0
        if self.at_least is not None:
            matrix[-1] = block.cost[new]
        self.program.add_columns(-self.cost_weight * block.cost[new], matrix)
        self.columns += [(g, int(k)) for k in new]
        self.known[g].update(int(k) for k in new)

    cost_weight = 1.0

    def aim(self, objective: Floats) -> None:
        """Seek the largest ``objective`` (4R,) over the structural variables instead of the value."""
        self.objective, self.cost_weight = objective, 0.0
        self.program.set_costs(np.concatenate([objective, self.penalty, np.zeros(len(self.columns))]))

    def _recomputed(self, dual: Floats) -> tuple[float, list[NDArray[np.float32]], list[float]]:
        """A valid bound from any duals: signs clipped, boxes and best combinations put in."""
        y = dual.copy()
        inequality = slice(self.rows["cut"], self.rows["block"])
        y[inequality] = np.maximum(y[inequality], 0.0)
        floor = 0.0
        if self.at_least is not None:
            floor = max(float(y[-1]), 0.0)
        link, cut = y[: 2 * self.n], y[self.rows["cut"] : self.rows["side"]]
        side = y[self.rows["side"] : self.rows["block"]]
        rest = self.objective.copy()
        rest[: 2 * self.n] -= link
        rest -= cut @ self.cut_matrix
        rest[3 * self.n :] += floor
        total = float(np.where(rest > 0.0, rest * self.upper, rest * self.lower).sum())
        total += float(cut @ self.cut_right) + float(side @ self.side_right)
        if self.at_least is not None:
            total -= floor * self.at_least
        q = self.model.room.size
        price = np.concatenate(
            [link, -side[:q], [side[q + 1] - side[q], -side[q + 2], -(self.cost_weight + floor)]]
        )
        reduced, tops = [], []
        for block in self.blocks:
            gain, best = priced(block, price)
            reduced.append(gain)
            tops.append(best)
        total += sum(tops)
        return total + 1e-9 * max(1.0, abs(total)), reduced, tops

    def solve(self, stop_below: float = -np.inf, tolerance: float = 1e-7) -> Bound | None:
        """Generate columns until none prices out by ``tolerance`` or the bound falls below ``stop_below``.

        The bound is valid whenever it stops; a coarse tolerance only makes it a little wider.

        None: the program has no solution, so the node holds no plan.
        """
        best, kept = np.inf, None
        for _round in range(_ROUNDS):
            answer = self.program.solve()
            if answer.status is not LinearStatus.OPTIMAL:
                break
            bound, reduced, tops = self._recomputed(answer.dual)
            if bound < best:
                best, kept = bound, (reduced, tops)
            duals = answer.dual[self.rows["block"] : self.rows["floor"]]
            excess, scale = 0.0, 1e-9 * max(1.0, abs(answer.value))
            for g, gain in enumerate(reduced):
                excess += max(tops[g] - float(duals[g]), 0.0)
                picks = np.flatnonzero(gain > duals[g] + scale)
                if picks.size > _COLUMNS_PER_ROUND:
                    last = picks.size - _COLUMNS_PER_ROUND
                    picks = picks[np.argpartition(gain[picks], last)[last:]]
                self.add(g, picks)
            if best <= stop_below or excess <= tolerance * max(1.0, abs(answer.value)):
                break
        if kept is None:
            return None
        return Bound(best, *kept, self._chosen(answer.x))

    def _chosen(self, x: Floats) -> list[dict[int, float]]:
        weights: list[dict[int, float]] = [{} for _ in self.blocks]
        if x.size:
            first = 4 * self.n + self.n_artificial
            for (g, k), share in zip(self.columns, x[first:], strict=False):
                if share > 1e-9:
                    weights[g][k] = float(share)
        return weights
