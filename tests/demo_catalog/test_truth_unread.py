"""The program gives identical answers when the truth is taken away."""

import shutil

import numpy as np

from planner.base.paths import demo_folder
from planner.demand.nested import fit_nested
from planner.sales.load import load, request_from_folder


def test_answers_do_not_depend_on_the_truth(tmp_path):
    bare = tmp_path / "demo"
    shutil.copytree(demo_folder(), bare, ignore=shutil.ignore_patterns("truth", "__pycache__"))
    assert (demo_folder() / "truth").is_dir()
    assert not (bare / "truth").exists()
    fits = []
    for folder in (demo_folder(), bare):
        loaded = load(request_from_folder(folder))
        fits.append((loaded, fit_nested(loaded.panel, loaded.catalogue, loaded.base)))
    (one, with_it), (two, without) = fits
    assert one.report.money_used == two.report.money_used
    np.testing.assert_array_equal(one.panel.units, two.panel.units)
    np.testing.assert_array_equal(with_it.draws.attraction, without.draws.attraction)
    assert with_it.log_likelihood == without.log_likelihood
