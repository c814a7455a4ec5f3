"""All checks with one command: system libraries, format, lint, types, layers, tests.

    python tests/run.py            quick tier: what CI runs
    python tests/run.py --slow     the slow tier as well

Window tests run serially in a step of their own, everything else on two workers with BLAS on
one thread each.
"""

from __future__ import annotations

import argparse
import ctypes
import os
import shutil
import subprocess
import sys
import time
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
LIBRARIES = ROOT / "resources" / "debian_libraries.txt"


def missing_libraries() -> list[str]:
    """Debian packages of resources/debian_libraries.txt whose shared library cannot be loaded.

    Each line of the file: package, white space, the library it brings.
    """
    missing = []
    for line in LIBRARIES.read_text(encoding="utf-8").splitlines():
        text = line.split("#")[0].split()
        if not text:
            continue
        package, library = text
        try:
            ctypes.CDLL(library)
        except OSError:
            missing.append(package)
    return missing


def bring_libraries() -> None:
    """Install the window's missing system libraries, or say how to."""
    missing = missing_libraries() if sys.platform.startswith("linux") else []
    if not missing:
        return
    install = ["apt-get", "install", "-y", "--no-install-recommends", *missing]
    if shutil.which("apt-get") is None or os.geteuid() != 0:
        sys.exit(
            f"The window needs system libraries that are missing: {' '.join(missing)}.\n"
            f"Install them (Debian: sudo {' '.join(install)}) and run this again."
        )
    environment = {**os.environ, "DEBIAN_FRONTEND": "noninteractive"}
    subprocess.run(["apt-get", "update", "-q"], check=True, env=environment)
    subprocess.run(install, check=True, env=environment)


def step(title: str, command: list[str], environment: dict[str, str]) -> bool:
    """Run one step, print how long it took, return whether it passed."""
    print(f"== {title}", flush=True)
    began = time.monotonic()
    done = subprocess.run(command, cwd=ROOT, env=environment)
    verdict = "passed" if done.returncode == 0 else f"FAILED (exit code {done.returncode})"
    print(f"== {title}: {verdict}", end=" ")
    print(f"in {time.monotonic() - began:.0f} s", flush=True)
    return done.returncode == 0


def main() -> int:
    """Run everything; every step runs even when an earlier one failed."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--slow", action="store_true", help="run the slow tier as well")
    choices = parser.parse_args()
    bring_libraries()
    environment = {**os.environ, "QT_QPA_PLATFORM": "offscreen"}
    for name in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
        environment[name] = "1"
    python = [sys.executable, "-m"]
    quick = "" if choices.slow else " and not slow"
    steps = [
        ("format", [*python, "ruff", "format", "--check", "."]),
        ("lint", [*python, "ruff", "check", "."]),
        ("types", [*python, "mypy"]),
        ("layers", [str(Path(sys.executable).parent / "lint-imports")]),
        ("window tests", [*python, "pytest", "-m", f"window{quick}", "-q"]),
        ("tests", [*python, "pytest", "-n", "2", "-m", f"not window{quick}", "-q"]),
    ]
    passed = [step(title, command, environment) for title, command in steps]
    return 0 if all(passed) else 1


if __name__ == "__main__":
    sys.exit(main())
