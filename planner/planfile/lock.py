"""One program copy per plan file: a lock beside it that dies with the process."""

from __future__ import annotations

import os
import sys
from pathlib import Path
from types import TracebackType
from typing import Self

from planner.base.errors import CallError
from planner.base.text import _

if sys.platform == "win32":
    import msvcrt
else:
    import fcntl


class PlanLock:
    """Holds ``.<name>.lock`` beside the plan file, locked, while the file is open.

    Taken at once (so it also works without ``with``); raises CallError when another copy of the
    program has the file open.  The lock is the operating system's, so a killed program leaves none
    behind; a lock file without an owner is taken over.  Where nothing can be written beside the
    file nobody can save there either: no lock is taken and ``held`` is False.
    """

    def __init__(self, path: Path) -> None:
        self._plan = path
        self.path = path.with_name(f".{path.name}.lock")
        self._file: int | None = None
        self.acquire()

    @property
    def held(self) -> bool:
        """The lock is ours."""
        return self._file is not None

    def acquire(self) -> None:
        """Take the lock if it is not held, or raise CallError."""
        if self._file is not None:
            return
        while True:
            try:
                file = os.open(self.path, os.O_RDWR | os.O_CREAT, 0o600)
            except PermissionError:
                return
            except OSError as error:
                if not self._plan.parent.is_dir():
                    raise CallError(
                        _("there is no folder {folder}.").format(folder=self._plan.parent),
                        place=str(self._plan),
                        remedy=_("Create the folder first, or choose another one."),
                    ) from error
                # A read-only disk: nobody can save there.
                return
            if not _locked(file):
                os.close(file)
                raise CallError(
                    _("the plan is open in another copy of the program."),
                    place=str(self._plan),
                    remedy=_("Close it there first, or work on a copy of the file."),
                )
            if _same_file(file, self.path):
                self._file = file
                return
            # Its owner removed it between our opening and locking: try with a new one.
            os.close(file)

    def release(self) -> None:
        """Give the lock back and remove its file."""
        if self._file is None:
            return
        file, self._file = self._file, None
        if sys.platform == "win32":
            # An open file cannot be removed there; one left behind without an owner does no harm.
            os.close(file)
        else:
            self.path.unlink(missing_ok=True)
            os.close(file)

    def __enter__(self) -> Self:
        self.acquire()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.release()


def _locked(file: int) -> bool:
    """Try to lock without waiting."""
    try:
        if sys.platform == "win32":
            msvcrt.locking(file, msvcrt.LK_NBLCK, 1)
        else:
            fcntl.flock(file, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError:
        return False
    return True


def _same_file(file: int, path: Path) -> bool:
    try:
        found = path.stat()
    except FileNotFoundError:
        return False
    mine = os.fstat(file)
    return (mine.st_dev, mine.st_ino) == (found.st_dev, found.st_ino)
