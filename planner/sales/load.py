"""The door of this package: from files to loaded data."""

from __future__ import annotations

from pathlib import Path

from planner.base.errors import CallError, DataError
from planner.base.progress import NoProgress, Progress, stop_if_cancelled
from planner.base.text import _
from planner.sales.assemble import assemble, judge_rows, place_on_axes
from planner.sales.matching import Matched, match
from planner.sales.reading import ENDINGS, read_table
from planner.sales.report import LoadedData
from planner.sales.request import TABLES, LoadRequest


def request_from_folder(folder: Path, **choices: object) -> LoadRequest:
    """A request for the tables found in a folder (sales.*, items.* and, where there, the others).

    choices: further fields of LoadRequest, also files that lie elsewhere.
    Raises DataError when the folder, sales or items are missing or a table is there twice.
    """
    if not folder.is_dir():
        raise DataError(
            _("there is no such folder."),
            place=str(folder),
            remedy=_("Give the folder that holds sales.* and items.*."),
        )
    files: dict[str, Path] = {}
    for name in TABLES:
        found = sorted(
            path
            for path in folder.iterdir()
            if path.name.casefold() in {name + ending for ending in ENDINGS}
            or (path.is_dir() and path.name.casefold() == name)
        )
        if len(found) > 1 and name not in choices:
            raise DataError(
                _("the table '{name}' is there more than once: {files}.").format(
                    name=name, files=", ".join(path.name for path in found)
                ),
                place=str(folder),
                remedy=_("Keep one of them in the folder."),
            )
        if found:
            files[name] = found[0]
    given = {**files, **choices}
    missing = [name for name in ("sales", "items") if name not in given]
    if missing:
        raise DataError(
            _("no file for {names}; expected {names}.csv (or {endings}).").format(
                names=" and ".join(missing), endings=" ".join(ENDINGS[1:])
            ),
            place=str(folder),
            remedy=_("Name the export so, or use the load command with --sales and --items."),
        )
    return LoadRequest(**given)  # type: ignore[arg-type]


def load(request: LoadRequest, progress: Progress = NoProgress()) -> LoadedData:  # noqa: B008
    """Read, match, check and build everything the later layers need.

    Raises DataError naming file, place and remedy for whatever cannot be used, CancelledError
    when the user stops.
    """
    tables = read_all(request, progress)
    progress.report(_("Checking rows"), 0.35)
    judged = judge_rows(request, tables)
    stop_if_cancelled(progress)
    progress.report(_("Building the catalogue"), 0.65)
    placed = place_on_axes(judged)
    stop_if_cancelled(progress)
    progress.report(_("Building the panel"), 0.75)
    return assemble(placed, progress)


def read_all(request: LoadRequest, progress: Progress) -> dict[str, Matched]:
    """Every table of the request, read and matched."""
    unknown = {table for table, _ours, _theirs in request.matches} - set(TABLES)
    if unknown:
        raise CallError(
            _("'{name}' is not a table; tables are {names}.").format(
                name=sorted(unknown)[0], names=", ".join(TABLES)
            ),
            remedy=_("Write --match TABLE.COLUMN=THEIR_NAME."),
        )
    tables: dict[str, Matched] = {}
    for name in TABLES:
        path = getattr(request, name)
        if path is None:
            continue
        progress.report(_("Reading {file}").format(file=Path(path).name), 0.0 if name == "sales" else 0.3)
        tables[name] = match(read_table(Path(path), name), request)
        stop_if_cancelled(progress)
    return tables
