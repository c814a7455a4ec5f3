"""The command line: one module per command, one place for exit codes."""

from __future__ import annotations

import argparse
import os
import sys
from typing import NoReturn

from planner import __version__
from planner.base.errors import CancelledError, RangewrightError
from planner.base.text import _
from planner.cli import export, fit, load, recommend, review, transfer
from planner.cli.output import finish, show_error, show_unexpected

COMMANDS = {
    "review": review,
    "load": load,
    "fit": fit,
    "transfer": transfer,
    "recommend": recommend,
    "export": export,
}


class _Parser(argparse.ArgumentParser):
    """A wrong call ends with exit code 2 and a last line of JSON."""

    def error(self, message: str) -> NoReturn:
        self.print_usage(sys.stderr)
        print(f"{self.prog}: {message}", file=sys.stderr)
        finish({"error": message, "exit": 2})
        raise SystemExit(2)


def parser() -> argparse.ArgumentParser:
    """All commands."""
    top = _Parser(
        prog="rangewright",
        description=_("Which items stay, go and come in a category, and what happens to their sales."),
        epilog=_("Without a command the window opens: rangewright [PLAN.rangewright | --demo]"),
        allow_abbrev=False,
    )
    top.add_argument("--version", action="version", version=f"rangewright {__version__}")
    commands = top.add_subparsers(dest="command", required=True, parser_class=_Parser, metavar=_("COMMAND"))
    for name, module in COMMANDS.items():
        words = module.words()
        module.add(commands.add_parser(name, help=words, description=words, allow_abbrev=False))
    return top


def main(arguments: list[str]) -> int:
    """Run one command; the exit code."""
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(encoding="utf-8", errors="replace")
    choices = parser().parse_args(arguments)
    try:
        return int(COMMANDS[choices.command].run(choices))
    except KeyboardInterrupt:
        return show_error(CancelledError(_("Cancelled.")))
    except BrokenPipeError:
        # Whoever read the output has gone; nothing can be said to them.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 1
    except RangewrightError as error:
        return show_error(error)
    except Exception as error:
        return show_unexpected(error)
