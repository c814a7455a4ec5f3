"""How large anything in a plan file may be, and the error for what cannot be trusted."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from planner.base.errors import PlanFileError
from planner.base.text import _


@dataclass(frozen=True)
class FileLimits:
    """json_bytes: one row of text.  blob_bytes: one blob.  blobs, rows: how many of each.

    values: numbers in one array, or cells of one frame's column.  decoded_bytes: all arrays together.
    depth: nesting of the text.
    """

    json_bytes: int = 64 * 2**20
    blob_bytes: int = 512 * 2**20
    rows: int = 64
    blobs: int = 20_000
    values: int = 2**28
    decoded_bytes: int = 4 * 2**30
    depth: int = 40


class Damage(Exception):
    """Something in the file is not as this program writes it; becomes a PlanFileError with the place."""


def plan_file_error(path: Path, reason: str) -> PlanFileError:
    """The file is not a sound plan file."""
    return PlanFileError(
        _("the plan file cannot be read: {reason}.").format(reason=reason),
        place=str(path),
        remedy=_("Open a copy made earlier, or load the sales again into a new plan."),
    )
