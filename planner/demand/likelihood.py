"""Log-likelihood of the nested share model, its gradient and its Fisher information.

Category and segments are nests (McFadden 1978; Verboven 1996).  In scaled form, with
rho_g = lambda_g / lambda_c (notation page of DEVELOPERS.md):

    V_jt = A_cj + sum_k X_jtk b_k          scaled utility; in unscaled form X_jtk b_k / lambda_g
    D_gt = sum_j a_jt exp(V_jt)            G_gt = rho_g ln D_gt + sum_m z_tm h_gm + f' l_gt
    P(j|g) = a_jt exp(V_jt) / D_gt         P(g|category) = exp(G_gt) / W_t,  W_t = sum_g exp(G_gt)
    eta_t = store + week + lambda_c ln W_t + e' k_t
    category volume: Poisson(exp(eta)) without shoppers, Binomial(N, logistic(eta)) with,
    nothing at all when only choices among the items are observed.

The likelihood splits into item given segment, segment given category and category volume;
every block's information is computed conditionally on the counts one level up, so that
their sum is positive semidefinite everywhere.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

CATEGORY_NONE, CATEGORY_VOLUME, CATEGORY_SHOPPERS = "none", "volume", "shoppers"


@dataclass(frozen=True)
class MarketBlock:
    """The markets of one cluster.

    level (T, G, L): what moves a segment beyond its shelf; category (T, E): what moves the category so.
    counts (T, J): choices.  log_part (T, J): ln of the part of the week on sale, -inf when absent.
    covariates (T, J, K).  season (T, M).  store, week (T,): positions among all stores and weeks.
    shoppers (T,): used in the shoppers form only (zeros otherwise).
    """

    counts: Floats
    log_part: Floats
    covariates: Floats
    season: Floats
    level: Floats
    category: Floats
    store: Ints
    week: Ints
    shoppers: Floats


@dataclass(frozen=True)
class Layout:
    """Where each group of parameters stands in the parameter vector theta.

    Order: A (C x J), b (K), logit rho (G), h (G x M), f (L), logit lambda_c (1), e (E), store (S),
    week (W).
    unscaled: covariates are divided by lambda_g (the textbook form); else they act on V directly.
    """

    n_clusters: int
    n_items: int
    n_covariates: int
    n_segments: int
    n_season: int
    n_stores: int
    n_weeks: int
    category: str
    n_level: int = 0
    n_category: int = 0
    unscaled: bool = False

    @property
    def items(self) -> slice:
        """A, cluster by cluster."""
        return slice(0, self.n_clusters * self.n_items)

    @property
    def covariates(self) -> slice:
        """b."""
        return slice(self.items.stop, self.items.stop + self.n_covariates)

    @property
    def ratio(self) -> slice:
        """logit rho."""
        return slice(self.covariates.stop, self.covariates.stop + self.n_segments)

    @property
    def season(self) -> slice:
        """h, segment by segment."""
        return slice(self.ratio.stop, self.ratio.stop + self.n_segments * self.n_season)

    @property
    def level(self) -> slice:
        """f."""
        return slice(self.season.stop, self.season.stop + self.n_level)

    @property
    def category_ratio(self) -> slice:
        """logit lambda_c."""
        return slice(self.level.stop, self.level.stop + 1)

    @property
    def category_effects(self) -> slice:
        """e."""
        return slice(self.category_ratio.stop, self.category_ratio.stop + self.n_category)

    @property
    def stores(self) -> slice:
        """Store effects."""
        return slice(self.category_effects.stop, self.category_effects.stop + self.n_stores)

    @property
    def weeks(self) -> slice:
        """Week effects."""
        return slice(self.stores.stop, self.stores.stop + self.n_weeks)

    @property
    def size(self) -> int:
        """Number of parameters."""
        return int(self.weeks.stop)


@dataclass(frozen=True)
class Evaluation:
    """Log-likelihood, gradient (P,), information (P, P), scores by store (S, P) when asked for."""

    value: float
    gradient: Floats
    information: Floats
    scores: Floats


def logistic(x: Floats) -> Floats:
    """1 / (1 + exp(-x)) without overflow."""
    result: Floats = 0.5 * (1.0 + np.tanh(0.5 * x))
    return result


@dataclass(frozen=True)
class _State:
    """Shares and inclusive values of one block at theta."""

    within: Floats  # (T, J) P(j|g)
    log_total: Floats  # (T, G) ln D, 0 where the segment is empty
    segment_share: Floats  # (T, G)
    log_inclusive: Floats  # (T,)
    utility: Floats  # (T, J) V
    linear: Floats  # (T, J) X b before division by lambda_g
    eta: Floats  # (T,)


def _split(block: MarketBlock, size: int) -> list[MarketBlock]:
    """Views of at most ``size`` markets each, in order."""
    return [
        MarketBlock(**{name: values[k : k + size] for name, values in block.__dict__.items()})
        for k in range(0, block.counts.shape[0], size)
    ]


class NestedLikelihood:
    """The likelihood over all cluster blocks.  segment (J,): segment of every item."""

    def __init__(
        self, blocks: tuple[MarketBlock, ...], segment: Ints, layout: Layout, chunk: int = 192
    ) -> None:
        self.blocks = blocks
        # Pieces that fit the processor's cache.
        self._parts = [(c, part) for c, block in enumerate(blocks) for part in _split(block, chunk)]
        self.segment = segment
        self.layout = layout
        self._membership = np.zeros((segment.size, layout.n_segments))
        self._membership[np.arange(segment.size), segment] = 1.0
        self._members = [np.flatnonzero(segment == g) for g in range(layout.n_segments)]

    def ratios(self, theta: Floats) -> tuple[Floats, float]:
        """rho (G,) and lambda_c."""
        lay = self.layout
        return logistic(theta[lay.ratio]), float(logistic(theta[lay.category_ratio])[0])

    def _state(self, block: MarketBlock, c: int, theta: Floats) -> _State:
        lay = self.layout
        rho, lambda_c = self.ratios(theta)
        items = theta[lay.items].reshape(lay.n_clusters, lay.n_items)[c]
        linear = block.covariates @ theta[lay.covariates] if lay.n_covariates else np.zeros_like(block.counts)
        scaled = linear / (rho * lambda_c)[self.segment] if lay.unscaled else linear
        utility = items + scaled
        with_part = utility + block.log_part
        # Largest utility of each segment is taken out before the exponential.
        top = np.stack([with_part[:, m].max(axis=1) for m in self._members], axis=1)
        empty = ~np.isfinite(top)
        top = np.where(empty, 0.0, top)
        weight = np.exp(with_part - top[:, self.segment])
        total = weight @ self._membership
        within = weight / np.where(empty, 1.0, total)[:, self.segment]
        log_total = np.where(empty, 0.0, np.log(np.where(empty, 1.0, total)) + top)
        level = rho * log_total
        if lay.n_season:
            level = level + block.season @ theta[lay.season].reshape(lay.n_segments, lay.n_season).T
        if lay.n_level:
            level = level + block.level @ theta[lay.level]
        level = np.where(empty, -np.inf, level)
        peak = level.max(axis=1)
        peak = np.where(np.isfinite(peak), peak, 0.0)
        share = np.exp(level - peak[:, None])
        inclusive = share.sum(axis=1)
        safe = np.where(inclusive > 0.0, inclusive, 1.0)
        log_inclusive = np.log(safe) + peak
        eta = lambda_c * log_inclusive
        if lay.category != CATEGORY_NONE:
            eta = eta + theta[lay.stores][block.store] + theta[lay.weeks][block.week]
            eta = eta + block.category @ theta[lay.category_effects]
        return _State(within, log_total, share / safe[:, None], log_inclusive, utility, linear, eta)

    def category_index(self, block: MarketBlock, c: int, theta: Floats) -> Floats:
        """eta (T,) of one block: log of the category's odds or volume."""
        return self._state(block, c, theta).eta

    def log_totals(self, block: MarketBlock, c: int, theta: Floats) -> Floats:
        """ln D (T, G) of one block, 0 where a segment is empty."""
        return self._state(block, c, theta).log_total

    def shares(self, block: MarketBlock, c: int, theta: Floats) -> Floats:
        """P(j | category) (T, J) of one block."""
        state = self._state(block, c, theta)
        return state.within * state.segment_share[:, self.segment]

    def expected_counts(self, block: MarketBlock, c: int, theta: Floats) -> Floats:
        """Expected choices (T, J) of one block; given the category's counts when only these are modelled."""
        state = self._state(block, c, theta)
        if self.layout.category == CATEGORY_VOLUME:
            category = np.exp(np.minimum(state.eta, 700.0))
        elif self.layout.category == CATEGORY_SHOPPERS:
            category = block.shoppers * logistic(state.eta)
        else:
            category = block.counts.sum(axis=1)
        return state.within * state.segment_share[:, self.segment] * category[:, None]

    def value(self, theta: Floats) -> float:
        """Log-likelihood; -inf where it is not finite.

        Multinomial and binomial coefficients and ln(units!) are left out: they do not depend on theta.
        """
        total = 0.0
        for c, block in self._parts:
            total += self._block_value(block, self._state(block, c, theta))
        return total if np.isfinite(total) else -np.inf

    def _block_value(self, block: MarketBlock, state: _State) -> float:
        sold = block.counts > 0.0
        with np.errstate(divide="ignore"):
            log_share = np.log(state.within) + np.log(state.segment_share)[:, self.segment]
        value = float((block.counts[sold] * log_share[sold]).sum())
        category = block.counts.sum(axis=1)
        if self.layout.category == CATEGORY_VOLUME:
            value += float((category * state.eta - np.exp(np.minimum(state.eta, 700.0))).sum())
        elif self.layout.category == CATEGORY_SHOPPERS:
            value += float((category * state.eta - block.shoppers * np.logaddexp(0.0, state.eta)).sum())
        return value

    def at_expected_counts(self, theta: Floats) -> NestedLikelihood:
        """The same likelihood with every count replaced by its expectation at theta."""
        blocks = tuple(
            replace(block, counts=self.expected_counts(block, c, theta))
            for c, block in enumerate(self.blocks)
        )
        return NestedLikelihood(blocks, self.segment, self.layout)

    def market_scores(self, theta: Floats) -> Floats:
        """Score of every market (all blocks' markets in order, P)."""
        parts = [
            _Pieces(self, block, c, theta, self._state(block, c, theta)).scores()
            for c, block in enumerate(self.blocks)
        ]
        return np.concatenate(parts)

    def map_curvature(self, theta: Floats, gradient: Floats) -> Floats:
        """What the logistic maps of rho and lambda_c add to the curvature, (P,), where positive.

        The information leaves it out (its expectation is zero); near a dissimilarity of 1 it
        is most of the curvature, and without it the climb crawls.
        """
        added = np.zeros_like(theta)
        for part in (self.layout.ratio, self.layout.category_ratio):
            added[part] = np.maximum(gradient[part] * np.tanh(0.5 * theta[part]), 0.0)
        return added

    def evaluate(self, theta: Floats, with_scores: bool = False, with_information: bool = True) -> Evaluation:
        """Log-likelihood, gradient and, when asked for, information (else zeros) at theta."""
        lay = self.layout
        gradient = np.zeros(lay.size)
        information = np.zeros((lay.size, lay.size) if with_information else (0, 0))
        scores = np.zeros((max(lay.n_stores, 1), lay.size if with_scores else 0))
        value = 0.0
        for c, block in self._parts:
            state = self._state(block, c, theta)
            value += self._block_value(block, state)
            pieces = _Pieces(self, block, c, theta, state)
            by_market = pieces.scores() if with_scores else None
            gradient += pieces.gradient()
            if with_information:
                pieces.add_information(information)
            if by_market is not None:
                np.add.at(scores, block.store, by_market)
        return Evaluation(value, gradient, information, scores)


class _Pieces:
    """Gradient and information of one block, built from the three levels."""

    def __init__(
        self, owner: NestedLikelihood, block: MarketBlock, c: int, theta: Floats, state: _State
    ) -> None:
        self.owner, self.block, self.state = owner, block, state
        self.lay = lay = owner.layout
        self.rho, self.lambda_c = owner.ratios(theta)
        self.n_items = lay.n_items
        start = c * lay.n_items
        self.own_items = np.arange(start, start + lay.n_items)
        # Common columns that move V or the segment level: b, logit rho, h, f.
        self.common = np.arange(lay.covariates.start, lay.level.stop)
        self.tail = np.arange(lay.category_ratio.start, lay.category_effects.stop)
        self.effective = self._effective_covariates()
        self.segment_counts = block.counts @ owner._membership
        self.category = block.counts.sum(axis=1)
        self._level_design()
        self._volume_weights()

    def _effective_covariates(self) -> Floats:
        """dV/d(b, rho) as (T, J, K + G) in the unscaled form, (T, J, K) in the scaled one."""
        x, lay = self.block.covariates, self.lay
        if not lay.unscaled:
            return x
        lam = (self.rho * self.lambda_c)[self.owner.segment]
        by_rho = -(self.state.linear / (lam * self.rho[self.owner.segment]))[:, :, None]
        return np.concatenate([x / lam[None, :, None], by_rho * self.owner._membership[None]], axis=2)

    def _level_design(self) -> None:
        """U (T, G, p): derivative of G_gt by the common parameters; mean (T, p): of ln W."""
        lay, state = self.lay, self.state
        n_markets, k = self.block.counts.shape[0], lay.n_covariates
        g_count, m_count = lay.n_segments, lay.n_season
        level = np.zeros((n_markets, g_count, self.common.size))
        # Each segment's mean of the covariates under P(j|g).
        n_effective = self.effective.shape[2]
        self.means = np.zeros((n_markets, g_count, n_effective))
        for g, members in enumerate(self.owner._members):
            self.means[:, g] = np.einsum("tj,tjk->tk", state.within[:, members], self.effective[:, members])
        level[:, :, :n_effective] = self.rho[None, :, None] * self.means
        for g in range(g_count):
            level[:, g, k + g] += state.log_total[:, g]
            level[:, g, k + g_count + g * m_count : k + g_count + (g + 1) * m_count] = self.block.season
        if lay.n_level:
            level[:, :, level.shape[2] - lay.n_level :] = self.block.level
        # Chain rule: rho = logistic(r).
        slope = np.ones(self.common.size)
        slope[k : k + g_count] = self.rho * (1.0 - self.rho)
        self.slope = slope
        self.level = level * slope
        self.level_mean = np.einsum("tg,tgp->tp", state.segment_share, self.level)
        self.item_mean = state.within * (self.rho * state.segment_share)[:, self.owner.segment]

    def _volume_weights(self) -> None:
        """First and second derivative weights of the category volume by eta."""
        eta, category = self.state.eta, self.category
        if self.lay.category == CATEGORY_NONE:
            self.volume_score = np.zeros_like(eta)
            self.volume_weight = np.zeros_like(eta)
        elif self.lay.category == CATEGORY_VOLUME:
            expected = np.exp(np.minimum(eta, 700.0))
            self.volume_score, self.volume_weight = category - expected, expected
        else:
            p = logistic(eta)
            self.volume_score = category - self.block.shoppers * p
            self.volume_weight = self.block.shoppers * p * (1.0 - p)

    def _residuals(self) -> tuple[Floats, Floats]:
        """Within residual (T, J) and segment residual (T, G) of the multinomial levels."""
        within = self.block.counts - self.segment_counts[:, self.owner.segment] * self.state.within
        segment = self.segment_counts - self.category[:, None] * self.state.segment_share
        # The category volume acts on every segment level through lambda_c ln W.
        segment = segment + (self.volume_score * self.lambda_c)[:, None] * self.state.segment_share
        return within, segment

    def _category_columns(self) -> Floats:
        """d eta / d (logit lambda_c, e), (T, 1 + E).  In the unscaled form lambda_c is fixed at 1."""
        by_ratio = self.state.log_inclusive * self.lambda_c * (1.0 - self.lambda_c)
        return np.concatenate([by_ratio[:, None], self.block.category], axis=1)

    def gradient(self) -> Floats:
        """Gradient over the whole parameter vector."""
        lay, owner = self.lay, self.owner
        within, segment = self._residuals()
        result = np.zeros(lay.size)
        on_items = within + (self.rho * segment)[:, owner.segment] * self.state.within
        result[self.own_items] = on_items.sum(axis=0)
        common = np.einsum("tg,tgp->p", segment, self.level)
        n_effective = self.effective.shape[2]
        common[:n_effective] += np.einsum("tj,tjk->k", within, self.effective) * self.slope[:n_effective]
        result[self.common] = common
        if lay.category != CATEGORY_NONE:
            result[self.tail] = self.volume_score @ self._category_columns()
            result[lay.stores] = np.bincount(self.block.store, self.volume_score, lay.n_stores)
            result[lay.weeks] = np.bincount(self.block.week, self.volume_score, lay.n_weeks)
        return result

    def scores(self) -> Floats:
        """Score of every market over the whole parameter vector, (T, P)."""
        lay, owner = self.lay, self.owner
        within, segment = self._residuals()
        result = np.zeros((self.category.size, lay.size))
        result[:, self.own_items] = within + (self.rho * segment)[:, owner.segment] * self.state.within
        common = np.einsum("tg,tgp->tp", segment, self.level)
        n_effective = self.effective.shape[2]
        common[:, :n_effective] += np.einsum("tj,tjk->tk", within, self.effective) * self.slope[:n_effective]
        result[:, self.common] = common
        if lay.category != CATEGORY_NONE:
            rows = np.arange(self.category.size)
            result[:, self.tail] = self.volume_score[:, None] * self._category_columns()
            result[rows, lay.stores.start + self.block.store] = self.volume_score
            result[rows, lay.weeks.start + self.block.week] = self.volume_score
        return result

    def add_information(self, information: Floats) -> None:
        """Add this block's Fisher information, level by level."""
        self._add_within(information)
        self._add_levels(information)
        if self.lay.category != CATEGORY_NONE:
            self._add_volume(information)

    def _add_within(self, information: Floats) -> None:
        """Item given segment: sum_t Y_gt Cov_{P(j|g)} of dV."""
        state, owner = self.state, self.owner
        weight = self.segment_counts[:, owner.segment] * state.within
        n_effective = self.effective.shape[2]
        slope = self.slope[:n_effective]
        common = self.common[:n_effective]
        flat = self.effective.reshape(-1, n_effective)
        cross = (flat * weight.reshape(-1, 1)).T @ flat
        spread = (self.means * self.segment_counts[:, :, None]).reshape(-1, n_effective)
        cross -= spread.T @ self.means.reshape(-1, n_effective)
        information[np.ix_(common, common)] += cross * np.outer(slope, slope)
        centred = self.effective - self.means[:, owner.segment]
        mixed = np.einsum("tj,tjk->jk", weight, centred) * slope
        information[np.ix_(self.own_items, common)] += mixed
        information[np.ix_(common, self.own_items)] += mixed.T
        information[self.own_items, self.own_items] += weight.sum(axis=0)
        for g, members in enumerate(owner._members):
            p = state.within[:, members]
            block = (p * self.segment_counts[:, g : g + 1]).T @ p
            own = self.own_items[members]
            information[np.ix_(own, own)] -= block

    def _add_levels(self, information: Floats) -> None:
        """Segment given category: sum_t Y_t Cov_{P(g)} of dG."""
        state, owner, own, common = self.state, self.owner, self.own_items, self.common
        weight = self.category[:, None] * state.segment_share
        flat = self.level.reshape(-1, common.size)
        block = (flat * weight.reshape(-1, 1)).T @ flat
        block -= (self.level_mean * self.category[:, None]).T @ self.level_mean
        information[np.ix_(common, common)] += block
        mixed = -(self.item_mean * self.category[:, None]).T @ self.level_mean
        for g, members in enumerate(owner._members):
            p = state.within[:, members] * self.rho[g]
            weighted = (p * weight[:, g : g + 1]).T
            mixed[members] += weighted @ self.level[:, g]
            information[np.ix_(own[members], own[members])] += weighted @ p
        information[np.ix_(own, common)] += mixed
        information[np.ix_(common, own)] += mixed.T
        pair = (self.item_mean * self.category[:, None]).T @ self.item_mean
        information[np.ix_(own, own)] -= pair

    def _add_volume(self, information: Floats) -> None:
        """Category volume: sum_t w_t (d eta)(d eta)'."""
        lay, block = self.lay, self.block
        stores = np.zeros((self.category.size, lay.n_stores))
        weeks = np.zeros((self.category.size, lay.n_weeks))
        rows = np.arange(self.category.size)
        stores[rows, block.store] = 1.0
        weeks[rows, block.week] = 1.0
        design = np.concatenate(
            [
                self.lambda_c * self.item_mean,
                self.lambda_c * self.level_mean,
                self._category_columns(),
                stores,
                weeks,
            ],
            axis=1,
        )
        tail = np.arange(lay.category_ratio.start, lay.weeks.stop)
        columns = np.concatenate([self.own_items, self.common, tail])
        information[np.ix_(columns, columns)] += (design * self.volume_weight[:, None]).T @ design
