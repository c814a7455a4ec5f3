"""Words for codes and states, the same in every table."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from planner.base.text import _
from planner.plan.limits import ItemLock
from planner.plan.plans import States
from planner.transfer.what_if import AS_TODAY, IN, OUT, today_states

# Stands for all clusters together in every file; no cluster may be called so.
ALL_CLUSTERS = "ALL"
LEAVES = ""

# The words of the recommend file; scripts depend on them, so they are not translated.
STATE_WORDS = {OUT: "out", IN: "in", AS_TODAY: "as today"}
ACTIONS = ("list", "extend", "withdraw", "delist", "keep")


def cluster_name(code: str) -> str:
    """The cluster for people; a chain without clusters has one without a name."""
    return code if code else _("all stores")


def action_of(today: int, plan: int) -> str:
    """keep | list | delist | extend | withdraw, from the states today and in the plan.

    "" for an item that is on no list today and on none in the plan.
    """
    if plan == today:
        return "" if plan == OUT else "keep"
    if plan == AS_TODAY:
        return "" if today == OUT else "keep"
    if plan == IN:
        return "list" if today == OUT else "extend"
    return "delist" if today == IN else "withdraw"


def changed_pairs(today: NDArray[np.bool_], cluster: NDArray[np.int64], states: States) -> NDArray[np.bool_]:
    """(C, J): items whose state differs from today's."""
    changed: NDArray[np.bool_] = today_states(today, cluster, states.shape[0]) != states
    return changed


def part_of_stores(today: NDArray[np.bool_], cluster: NDArray[np.int64], n: int) -> NDArray[np.float64]:
    """(C, J): part of each cluster's stores that list the item."""
    return np.stack([today[cluster == c].mean(axis=0) for c in range(n)])


def plan_word(states: NDArray[np.int8], today: NDArray[np.int8]) -> str:
    """One item's states (C,) over all clusters in a word or two."""
    words = {IN: _("in"), AS_TODAY: _("as today"), OUT: _("out")}
    if (states == states[0]).all():
        return words[int(states[0])]
    if (states == today).all():
        return words[AS_TODAY]
    counts = [(int((states == state).sum()), word) for state, word in words.items()]
    return ", ".join(_("{n} {word}").format(n=n, word=word) for n, word in counts if n)


def lock_words(locks: tuple[ItemLock, ...], item: str, cluster: str | None = None) -> str:
    """What is locked for an item: kind, cluster, reason and end date."""
    words = []
    for lock in locks:
        if lock.item != item or (cluster is not None and lock.cluster not in ("", cluster)):
            continue
        text = {"keep": _("keep"), "never": _("never"), "as today": _("as today")}.get(lock.kind, lock.kind)
        if lock.cluster:
            text = _("{kind} in {cluster}").format(kind=text, cluster=lock.cluster)
        if lock.until:
            text = _("{kind} until {day}").format(kind=text, day=lock.until)
        words.append(_("{kind}: {reason}").format(kind=text, reason=lock.reason) if lock.reason else text)
    return "; ".join(words)
