"""Saving and loading a plan file."""

from __future__ import annotations

import json
from dataclasses import fields
from pathlib import Path

from planner import __version__
from planner.base.target_file import check_target, replacing
from planner.demand.fitted import FittedModel
from planner.plan.limits import Limits
from planner.plan.plans import NamedPlan, States
from planner.planfile.contents import PlanContents
from planner.planfile.damage import Damage, FileLimits
from planner.planfile.database import check_identity, read_database, write_database
from planner.planfile.records import Reader, Writer, type_test
from planner.planfile.shapes import check_shapes, refuse_unfit
from planner.sales.report import LoadedData

__all__ = ["ENDING", "PlanContents", "load", "save"]

ENDING = ".rangewright"

# Checked as the records' own fields are.
_PARTS: dict[str, object] = {
    "loaded": LoadedData | None,
    "fitted": FittedModel | None,
    "states": States | None,
    "limits": Limits,
    "plans": tuple[NamedPlan, ...],
}


def save(path: Path, contents: PlanContents) -> None:
    """Replace what the plan file holds, in one transaction; a new file appears complete or not at all.

    Blobs that did not change are not written again.  Raises CallError when the target cannot be
    written, PlanFileError when it is another program's file, damaged, or of a newer format.
    """
    refuse_unfit(contents)
    writer = Writer()
    parts = [part.name for part in fields(contents)]
    texts = {"program": json.dumps({"version": __version__, "parts": parts})}
    for part in fields(contents):
        texts[part.name] = json.dumps(writer.write(getattr(contents, part.name)), separators=(",", ":"))
    limits = FileLimits()
    check_target(path)
    if path.exists() and path.stat().st_size:
        check_identity(path)
        write_database(path, texts, writer.blobs, create=False, limits=limits)
        return
    with replacing(path) as part_file:
        write_database(part_file, texts, writer.blobs, create=True, limits=limits)


def load(path: Path, limits: FileLimits | None = None) -> PlanContents:
    """Everything the plan file holds.

    Raises PlanFileError for a missing, foreign, damaged, newer or oversized file.
    """
    allowed = limits if limits is not None else FileLimits()
    with read_database(path, allowed) as file:
        texts = file.texts()
        reader = Reader(file.blob, allowed)
        known = {part.name for part in fields(PlanContents)}
        contents = _contents({name: reader.read(texts[name]) for name in _parts(texts) if name in known})
        check_shapes(contents)
    return contents


def _parts(texts: dict[str, object]) -> list[str]:
    """Names of the parts that were saved; one of them missing is damage, not an old file."""
    program = texts.get("program")
    parts = program.get("parts") if isinstance(program, dict) else None
    if not isinstance(parts, list) or not all(isinstance(name, str) and name in texts for name in parts):
        raise Damage("a part is missing")
    return parts


def _contents(values: dict[str, object]) -> PlanContents:
    for name, hint in _PARTS.items():
        if name in values and not type_test(hint)(values[name]):
            raise Damage(f"{name} holds a value of another kind")
    settings = values.get("settings", {})
    if not isinstance(settings, dict) or not all(isinstance(key, str) for key in settings):
        raise Damage("settings hold a value of another kind")
    try:
        return PlanContents(**values)  # type: ignore[arg-type]
    except TypeError as error:
        raise Damage(str(error)) from error
