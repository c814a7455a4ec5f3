"""Dispatch: a command goes to the command line, everything else opens the window."""

from __future__ import annotations

import multiprocessing
import os
import sys


def main(argv: list[str] | None = None) -> int:
    """rangewright [COMMAND ... | PLAN.rangewright | --demo]; the exit code."""
    multiprocessing.freeze_support()
    # Before numpy is imported: the matrices are small, and threads that wait for each other cost
    # more than they bring.
    for name in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
        os.environ.setdefault(name, "1")
    arguments = sys.argv[1:] if argv is None else argv
    if not arguments or arguments[0] == "--demo" or arguments[0].endswith(".rangewright"):
        from planner.gui.app.start import run

        return run(arguments)
    from planner.cli.main import main as command_line

    return command_line(arguments)


if __name__ == "__main__":
    sys.exit(main())
