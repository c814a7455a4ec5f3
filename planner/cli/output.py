"""What the command line prints: words, errors, progress on a terminal, and the last line of JSON."""

from __future__ import annotations

import json
import math
import sys
import tempfile
import traceback
from datetime import date
from decimal import Decimal
from pathlib import Path
from typing import Any

from planner.base.errors import RangewrightError
from planner.base.text import _


class TerminalProgress:
    """Progress on standard error, only when it is a terminal; never cancelled from within."""

    def __init__(self) -> None:
        self._shown = sys.stderr.isatty()

    def report(self, step: str, fraction: float | None = None) -> None:
        """Overwrite the line."""
        if self._shown:
            part = "" if fraction is None else f" {100.0 * fraction:.0f} %"
            sys.stderr.write(f"\r\x1b[K{step}{part}")
            sys.stderr.flush()

    def improved(self, answer: dict[str, object]) -> None:
        """Show value and bound of the best so far."""
        value, bound = answer.get("value"), answer.get("bound")
        if self._shown and isinstance(value, float) and isinstance(bound, float):
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
    """A value as JSON may hold it: no NaN, no numpy, exact money as text."""
    if isinstance(value, dict):
        return {str(key): plain(entry) for key, entry in value.items()}
    if isinstance(value, list | tuple):
        return [plain(entry) for entry in value]
    if isinstance(value, Decimal):
        return format(value, "f")
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
    finish({"error": error.problem, "place": error.place, "remedy": error.remedy, "exit": error.exit_code})
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
