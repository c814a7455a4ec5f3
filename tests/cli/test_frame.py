"""What every command shares: help, exit codes, the last line, locale, signals, what is imported."""

from __future__ import annotations

import io
import json
import os
import re
import shutil
import signal
import subprocess
import sys
import tempfile
import types
from datetime import date
from decimal import Decimal
from pathlib import Path

import numpy as np
import pytest

import planner
from planner import __main__ as door
from planner.base.errors import CancelledError
from planner.cli import main as command_line
from planner.cli import output
from planner.review import engine
from tests.cli.conftest import call

ROOT = Path(__file__).resolve().parents[2]

OPTIONS = {
    "review": ("FOLDER", "--workbook", "--plan", "--seconds"),
    "load": (
        "--sales", "--items", "--stores", "--shoppers", "--costs", "--ranges", "--offers", "--successors",
        "--match", "--category", "--segment-by", "--set-aside", "--plan",
    ),
    "fit": ("--plan", "--model", "--segment-by", "--draws", "--seed"),
    "transfer": ("--plan", "--delist", "--list", "--price", "--cluster", "--csv"),
    "recommend": ("--plan", "--limits", "--changes", "--goal", "--seconds", "--gap", "--name", "--csv"),
    "export": ("--plan", "--name", "--workbook", "--report", "--stores-list", "--with-costs"),
}  # fmt: skip


def process(*arguments: object, **environment: str) -> subprocess.CompletedProcess[str]:
    """The command in a process of its own, as a script calls it."""
    return subprocess.run(
        [sys.executable, "-m", "planner", *map(str, arguments)],
        cwd=ROOT,
        capture_output=True,
        encoding="utf-8",
        env={**os.environ, **environment},
        check=False,
    )


# -- help and dispatch ---------------------------------------------------------------------------


@pytest.mark.parametrize("command", OPTIONS)
def test_help_lists_the_contracts_options(command: str, capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as end:
        command_line.main([command, "--help"])
    assert end.value.code == 0
    shown = capsys.readouterr().out
    for option in OPTIONS[command]:
        assert re.search(rf"(?<![\w-]){re.escape(option)}(?![\w-])", shown), option
    listed = set(re.findall(r"(?<![\w-])--[a-z][a-z-]*", shown)) - {"--help"}
    assert listed == {option for option in OPTIONS[command] if option.startswith("--")}


def test_help_lists_every_command_and_the_window(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as end:
        door.main(["--help"])
    assert end.value.code == 0
    shown = capsys.readouterr().out
    assert set(OPTIONS) == set(command_line.COMMANDS)
    assert all(command in shown for command in OPTIONS)
    assert "--demo" in shown


def test_version(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as end:
        door.main(["--version"])
    assert end.value.code == 0
    assert capsys.readouterr().out == f"rangewright {planner.__version__}\n"


@pytest.mark.parametrize("arguments", [[], ["--demo"], ["a folder/my plan.rangewright"]])
def test_everything_else_opens_the_window(arguments: list[str], monkeypatch: pytest.MonkeyPatch) -> None:
    opened: list[list[str]] = []

    def run(argv: list[str]) -> int:
        opened.append(argv)
        return 7

    stand_in = types.ModuleType("planner.gui.app.start")
    monkeypatch.setattr(stand_in, "run", run, raising=False)
    monkeypatch.setitem(sys.modules, "planner.gui.app.start", stand_in)
    assert door.main(arguments) == 7
    assert opened == [arguments]


@pytest.mark.parametrize(
    "arguments", [["poem"], ["fit"], ["fit", "--plan"], ["load", "--plan", "p"], ["transfer", "x"]]
)
def test_wrong_calls_exit_2_with_a_last_line(arguments: list[str]) -> None:
    done = call(*arguments)
    assert (done.code, done.answer["exit"]) == (2, 2)
    assert done.errors


# -- errors --------------------------------------------------------------------------------------


def test_an_unexpected_error_exits_1_with_a_report(
    plan: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def fails(*arguments: object) -> None:
        raise ZeroDivisionError("by nought")

    monkeypatch.setattr(engine, "run_fit", fails)
    monkeypatch.setattr(tempfile, "tempdir", str(tmp_path))
    done = call("fit", "--plan", plan)
    assert (done.code, done.answer["exit"]) == (1, 1)
    report = Path(done.answer["report"])
    assert report.parent == tmp_path
    assert report.name in done.errors
    assert "Traceback" not in done.errors
    written = report.read_text(encoding="utf-8")
    assert "Traceback" in written
    assert "by nought" in written


@pytest.mark.parametrize("error", [KeyboardInterrupt(), CancelledError("Cancelled.")])
def test_cancelled_exits_130(plan: Path, monkeypatch: pytest.MonkeyPatch, error: BaseException) -> None:
    def stops(*arguments: object) -> None:
        raise error

    monkeypatch.setattr(engine, "run_recommend", stops)
    before = plan.read_bytes()
    done = call("recommend", "--plan", plan)
    assert (done.code, done.answer["exit"]) == (130, 130)
    assert plan.read_bytes() == before
    assert not list(plan.parent.glob(".*.lock"))


def test_interrupting_a_running_command(plan: Path) -> None:
    """Ctrl-C in the middle of the work."""
    code = (
        "import sys, time\n"
        "from planner.review import engine\n"
        "def waits(*arguments):\n"
        "    print('working', flush=True)\n"
        "    time.sleep(60)\n"
        "engine.run_recommend = waits\n"
        "from planner.__main__ import main\n"
        "sys.exit(main(sys.argv[1:]))\n"
    )
    command = [sys.executable, "-c", code, "recommend", "--plan", str(plan)]
    running = subprocess.Popen(command, cwd=ROOT, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)
    assert running.stdout is not None
    assert running.stdout.readline() == "working\n"
    running.send_signal(signal.SIGINT)
    out, err = running.communicate(timeout=30)
    assert running.returncode == 130
    assert json.loads(out.splitlines()[-1])["exit"] == 130
    assert "Traceback" not in err


def test_a_reader_that_has_gone_is_no_unexpected_error(plan: Path, tmp_path: Path) -> None:
    with subprocess.Popen(
        [sys.executable, "-m", "planner", "transfer", "--plan", str(plan), "--delist", "0012"],
        cwd=ROOT,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        env={**os.environ, "TMPDIR": str(tmp_path), "PYTHONUNBUFFERED": "1"},
    ) as running:
        assert running.stdout is not None
        assert running.stderr is not None
        running.stdout.close()
        said = running.stderr.read()
        running.wait(timeout=30)
    assert running.returncode == 1
    assert said == b""
    assert not list(tmp_path.glob("rangewright-report-*"))


# -- the last line and the terminal --------------------------------------------------------------


def test_values_of_the_last_line_are_plain() -> None:
    given = {
        "a": float("nan"),
        "b": np.float64("inf"),
        "c": np.array([1.5, np.nan]),
        "d": Decimal("3039926.90"),
        "e": date(2026, 1, 5),
        "f": (np.int64(3), None, "ü"),
        "g": Path("x"),
        7: True,
    }
    expected = {
        "a": None, "b": None, "c": [1.5, None], "d": 3039926.9, "e": "2026-01-05", "f": [3, None, "ü"],
        "g": "x", "7": True,
    }  # fmt: skip
    assert output.plain(given) == expected
    assert json.dumps(output.plain(given), allow_nan=False)


class Terminal(io.StringIO):
    """A standard error that is a terminal."""

    def isatty(self) -> bool:
        return True


def test_progress_is_for_terminals_only(monkeypatch: pytest.MonkeyPatch) -> None:
    quiet, shown = io.StringIO(), Terminal()
    for stream in (quiet, shown):
        monkeypatch.setattr(sys, "stderr", stream)
        progress = output.TerminalProgress()
        progress.report("Reading", 0.25)
        progress.report("too soon to be shown", 0.26)
        progress.improved({"value": 1.0, "bound": 2.0})
        progress.clear()
        assert not progress.cancelled()
    assert quiet.getvalue() == ""
    assert "Reading 25 %, 0 s" in shown.getvalue()
    assert "too soon" not in shown.getvalue()
    assert shown.getvalue().endswith("\r\x1b[K")


def test_the_best_so_far_is_shown(monkeypatch: pytest.MonkeyPatch) -> None:
    shown = Terminal()
    monkeypatch.setattr(sys, "stderr", shown)
    output.TerminalProgress().improved({"value": 10.0, "bound": 12.5})
    assert "10.00" in shown.getvalue()
    assert "12.50" in shown.getvalue()


# -- in a process of its own ---------------------------------------------------------------------


def comma_locale(folder: Path) -> dict[str, str]:
    """Environment of a German user; the locale is built where the system can build it."""
    name = "de_DE.UTF-8"
    tool = shutil.which("localedef")
    if tool is not None:
        command = [tool, "-i", "de_DE", "-f", "UTF-8", str(folder / name)]
        subprocess.run(command, capture_output=True, check=False)
    return {"LC_ALL": name, "LANG": name, "LANGUAGE": "de", "LOCPATH": str(folder)}


def test_files_and_answers_do_not_depend_on_the_locale(plan: Path, tmp_path: Path) -> None:
    environments: list[dict[str, str]] = [
        {},
        comma_locale(tmp_path),
        {"LC_ALL": "C", "PYTHONCOERCECLOCALE": "0", "PYTHONUTF8": "0", "PYTHONIOENCODING": "ascii"},
    ]
    results = []
    for environment in environments:
        path = tmp_path / "t.csv"
        done = process("transfer", "--plan", plan, "--delist", "0011", "--csv", path, **environment)
        assert (done.returncode, done.stderr) == (0, "")
        assert "Österbeck" in done.stdout
        results.append((done.stdout, path.read_bytes()))
    assert results[0] == results[1] == results[2]


def test_the_command_line_never_imports_the_window(plan: Path, tmp_path: Path) -> None:
    book = tmp_path / "o.xlsx"
    code = (
        "import sys\n"
        "from planner.__main__ import main\n"
        f"assert main(['recommend', '--plan', {str(plan)!r}, '--changes', '1']) == 0\n"
        f"assert main(['export', '--plan', {str(plan)!r}, '--workbook', {str(book)!r}]) == 0\n"
        "import os\n"
        "qt = [name for name in sys.modules if name.startswith(('PySide6', 'shiboken', 'planner.gui'))]\n"
        "print(qt, os.environ['OPENBLAS_NUM_THREADS'], os.environ['OMP_NUM_THREADS'])\n"
    )
    environment = {name: value for name, value in os.environ.items() if not name.endswith("_NUM_THREADS")}
    environment["OMP_NUM_THREADS"] = "2"
    done = subprocess.run(
        [sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True, env=environment, check=False
    )
    assert done.returncode == 0, done.stderr
    # No window; one BLAS thread unless the user wants more.
    assert done.stdout.splitlines()[-1] == "[] 1 2"


@pytest.mark.slow
def test_the_demos_review_takes_under_a_minute(tmp_path: Path) -> None:
    book = tmp_path / "demo.xlsx"
    done = process("review", ROOT / "demo_catalog", "--workbook", book)
    assert (done.returncode, done.stderr) == (0, "")
    answer = json.loads(done.stdout.splitlines()[-1])
    print(f"review of the demo: {answer['seconds']:.1f} s")
    assert answer["seconds"] < 60.0
    assert book.stat().st_size > 20_000
