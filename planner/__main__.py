"""Dispatch: a command goes to the command line, everything else opens the window."""

from __future__ import annotations

import multiprocessing
import sys

COMMANDS = ("review", "load", "fit", "transfer", "recommend", "export")


def main(argv: list[str] | None = None) -> int:
    """rangewright [COMMAND ... | PLAN.rangewright | --demo]; the exit code."""
    multiprocessing.freeze_support()
    arguments = sys.argv[1:] if argv is None else argv
    first = arguments[0] if arguments else ""
    opens_window = not arguments or first == "--demo" or first.endswith(".rangewright")
    if opens_window:
        from planner.gui.app.start import run

        return run(arguments)
    from planner.cli.main import main as command_line

    return command_line(arguments)


if __name__ == "__main__":
    sys.exit(main())
