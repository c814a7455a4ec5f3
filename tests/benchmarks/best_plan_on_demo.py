"""Best plans of the demo: proven gap, time, and what the plan is truly worth to the shoppers behind it.

    python -m tests.benchmarks.best_plan_on_demo

Prints a table and writes it beside itself under results/, with the commit and the machine.
"""

from __future__ import annotations

import platform
import resource
import subprocess
import time
from pathlib import Path

import numpy as np

from demo_catalog.generate import DemoSettings, build
from planner.base.paths import demo_folder
from planner.demand.nested import fit_nested
from planner.optimise.problem import SolverSettings
from planner.optimise.solve import best_assortment
from planner.plan.limits import Limits
from planner.review.problem import pose_problem
from planner.sales.load import load, request_from_folder
from planner.transfer.what_if import presence

RUNS = ((5, 20.0), (10, 20.0), (20, 20.0), (None, 20.0), (None, 60.0))


def main() -> None:
    """Run every size once."""
    loaded = load(request_from_folder(demo_folder()))
    fitted = fit_nested(loaded.panel, loaded.catalogue, loaded.base)
    market = build(DemoSettings()).market
    items = [list(market.items).index(item.code) for item in loaded.catalogue.items]
    stores = [list(market.stores).index(store.code) for store in loaded.catalogue.stores]

    def truly(present: np.ndarray) -> float:
        shelf = np.zeros_like(market.today)
        shelf[np.ix_(stores, items)] = present
        return market.margin(shelf)

    today = truly(loaded.base.today)
    rows = ["changes allowed,seconds allowed,status,value,bound,gap %,seconds,true margin,true gain"]
    for changes, seconds in RUNS:
        problem = pose_problem(loaded, fitted, Limits(max_changes=changes)).problem
        began = time.perf_counter()
        found = best_assortment(problem, SolverSettings(seconds=seconds))
        took = time.perf_counter() - began
        present = presence(found.states, loaded.base.today, fitted.estimate.cluster)
        true = truly(present)
        rows.append(
            f"{'any' if changes is None else changes},{seconds:.0f},{found.status},{found.value:.1f},"
            f"{found.bound:.1f},{100 * found.gap:.3f},{took:.1f},{true:.1f},{true - today:+.1f}"
        )
        print(rows[-1], flush=True)
    commit = subprocess.run(
        ["git", "rev-parse", "--short", "HEAD"], capture_output=True, text=True, check=False
    )
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024.0
    rows.append(
        f"# commit {commit.stdout.strip()}, Python {platform.python_version()}, {platform.machine()}, "
        f"peak memory {peak:.0f} MB, true margin today {today:.1f} a week"
    )
    print(rows[-1])
    target = Path(__file__).parent / "results" / "best_plan_on_demo.csv"
    target.write_text("\n".join(rows) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()
