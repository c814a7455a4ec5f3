"""Records of what a command changed; views decide from them what to redraw."""

from __future__ import annotations

from dataclasses import dataclass

KINDS = frozenset({"data", "fit", "states", "limits", "plans", "history", "file"})


@dataclass(frozen=True)
class Change:
    """kinds: which parts of the review changed (a subset of KINDS); label: the command, for people;
    items: codes of the items touched, empty when all may be."""

    kinds: frozenset[str]
    label: str = ""
    items: tuple[str, ...] = ()
