"""A program that saves two reviews in turn until it is killed, or holds a plan file's lock.

python -m tests.planfile.saver save PATH
python -m tests.planfile.saver hold PATH
"""

from __future__ import annotations

import dataclasses
import sys
import time
from pathlib import Path

from planner.planfile.lock import PlanLock
from planner.planfile.store import PlanContents, save
from tests.tables import records


def versions() -> tuple[PlanContents, PlanContents]:
    """Two reviews that differ in texts and in blobs."""
    first = PlanContents(records.loaded(), records.fitted(), records.planned(), settings={"version": 1})
    data = records.loaded()
    panel = dataclasses.replace(data.panel, units=data.panel.units + 1.0, price=data.panel.price * 2.0)
    second = dataclasses.replace(
        first, loaded=dataclasses.replace(data, panel=panel), states=records.now(), settings={"version": 2}
    )
    return first, second


def main() -> None:
    """Say "ready", then work until killed."""
    what, path = sys.argv[1], Path(sys.argv[2])
    both = versions()
    if what == "hold":
        with PlanLock(path):
            print("ready", flush=True)
            time.sleep(60.0)
        return
    print("ready", flush=True)
    while True:
        for contents in both:
            save(path, contents)


if __name__ == "__main__":
    main()
