"""Writing a file for the user: beside the target first, then in its place in one step."""

from __future__ import annotations

import secrets
import stat
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from planner.base.errors import CallError
from planner.base.text import _


def check_target(path: Path, endings: tuple[str, ...] = ()) -> None:
    """Refuse a target that cannot be written: ending, folder, read-only file.

    endings: allowed, with the point, in lower case; empty: any.  Raises CallError.
    """
    if endings and path.suffix.lower() not in endings:
        raise CallError(
            _("the file name ends in '{ending}'; expected {endings}.").format(
                ending=path.suffix, endings=_(" or ").join(endings)
            ),
            place=str(path),
            remedy=_("Give a name such as {name}.").format(name=path.with_suffix(endings[0]).name),
        )
    if not path.parent.is_dir():
        raise CallError(
            _("there is no folder {folder}.").format(folder=path.parent),
            place=str(path),
            remedy=_("Create the folder first, or choose another one."),
        )
    if path.is_dir():
        raise CallError(
            _("this is a folder; expected the name of a file."),
            place=str(path),
            remedy=_("Add a file name."),
        )
    if path.exists() and not path.is_file():
        raise CallError(
            _("this is not an ordinary file."),
            place=str(path),
            remedy=_("Choose another name."),
        )
    if path.exists() and not path.stat().st_mode & stat.S_IWUSR:
        raise CallError(
            _("the file is marked read-only."),
            place=str(path),
            remedy=_("Allow writing to it, or choose another name."),
        )


@contextmanager
def replacing(path: Path, endings: tuple[str, ...] = ()) -> Iterator[Path]:
    """Give a temporary path beside ``path``; when the block ends well, it takes the place of ``path``.

    The target is either the old file or the whole new one, never half of it.  Raises CallError
    with place and remedy when the target cannot be written.
    """
    check_target(path, endings)
    part = path.with_name(f".{secrets.token_hex(6)}.part{path.suffix}")
    try:
        yield part
        part.replace(path)
    except OSError as error:
        raise CallError(
            _("the file cannot be written ({reason}).").format(reason=error.strerror or error),
            place=str(path),
            remedy=_("Close it in other programs and check the folder's rights and free space."),
        ) from error
    finally:
        part.unlink(missing_ok=True)
