"""What the command line prints: words, errors, progress on a terminal, and the last line of JSON."""

from __future__ import annotations

import json
import math
import shutil
import sys
import tempfile
import time
import traceback
from datetime import date
from decimal import Decimal
from pathlib import Path
from typing import Any

from planner.base.errors import LimitsError, RangewrightError
from planner.base.text import _

_SHOWN_EVERY = 0.1


class TerminalProgress:
    """Progress on standard error, only when it is a terminal; never cancelled from within."""

    def __init__(self) -> None:
        self._shown = sys.stderr.isatty()
        self._began = time.monotonic()
        self._last = 0.0

    def report(self, step: str, fraction: float | None = None) -> None:
        """Overwrite the line: step, part and seconds."""
        now = time.monotonic()
        if not self._shown or now - self._last < _SHOWN_EVERY:
            return
        self._last = now
        part = "" if fraction is None else f" {100.0 * fraction:.0f} %"
        line = f"{step}{part}, {now - self._began:.0f} s"
        sys.stderr.write(f"\r\x1b[K{line[: shutil.get_terminal_size().columns - 1]}")
        sys.stderr.flush()

    def improved(self, answer: dict[str, object]) -> None:
        """Show value and bound of the best so far."""
        value, bound = answer.get("value"), answer.get("bound")
        if isinstance(value, float) and isinstance(bound, float):
            self.report(_("Best so far {value:.2f}, bound {bound:.2f}").format(value=value, bound=bound))

    def cancelled(self) -> bool:
        """Ctrl-C arrives as KeyboardInterrupt instead."""
        return False

    def clear(self) -> None:
        """Leave an empty line behind."""
        if self._shown:
            sys.stderr.write("\r\x1b[K")
            sys.stderr.flush()


def plain(value: Any) -> Any:
    """A value as JSON may hold it: no NaN, no numpy; money as its shortest number."""
    if isinstance(value, dict):
        return {str(key): plain(entry) for key, entry in value.items()}
    if isinstance(value, list | tuple):
        return [plain(entry) for entry in value]
    if isinstance(value, Decimal):
        # Exact to a cent up to ten thousand billions.
        return float(value)
    if isinstance(value, date | Path):
        return str(value)
    if hasattr(value, "tolist"):
        return plain(value.tolist())
    if isinstance(value, float) and not math.isfinite(value):
        return None
    return value


def say(words: str) -> None:
    """One line or more for people."""
    print(words)


def finish(answer: dict[str, Any]) -> None:
    """The last line: one line of JSON."""
    print(json.dumps(plain(answer), ensure_ascii=False, allow_nan=False), flush=True)


def show_error(error: RangewrightError) -> int:
    """Words on standard error, JSON on the last line of standard output; the exit code."""
    print(str(error), file=sys.stderr)
    answer: dict[str, Any] = {
        "error": error.problem,
        "place": error.place,
        "remedy": error.remedy,
        "exit": error.exit_code,
    }
    if isinstance(error, LimitsError):
        answer |= {"status": "impossible", "value": None, "bound": None, "gap": None}
    finish(answer)
    return error.exit_code


def show_unexpected(error: BaseException) -> int:
    """Write a report file and say where; exit code 1."""
    with tempfile.NamedTemporaryFile(
        "w", prefix="rangewright-report-", suffix=".txt", delete=False, encoding="utf-8"
    ) as report:
        traceback.print_exception(error, file=report)
    said = _("Unexpected error: {error}. A report was written to {path}.").format(
        error=error, path=report.name
    )
    print(said, file=sys.stderr)
    finish({"error": str(error), "report": report.name, "exit": 1})
    return 1
