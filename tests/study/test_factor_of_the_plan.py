"""What is known beforehand of a growth factor multiplies that of the plan."""

import runpy
from pathlib import Path

import numpy as np
import pytest
from scipy.stats import norm

INVENTED = runpy.run_path(str(Path(__file__).parent / "invented_soundings.py"))


def test_a_place_without_soundings_has_the_factor_of_the_plan_and_its_scatter():
    # Log-normal with a scatter of 0.3 in the logarithm about the plan's own factor.
    expected = (1.3 * np.exp(0.3 * norm.ppf([0.05, 0.5, 0.95]))).tolist()
    sounded, bare = INVENTED["invented_results"](growth_factor=1.3).places
    assert bare.prior_factor == pytest.approx(expected, rel=1e-3)
    assert bare.growth_factor == pytest.approx(expected, rel=1e-3)
    assert sounded.prior_factor == pytest.approx(expected, rel=1e-3)
    assert bare.prior_factor[1] == pytest.approx(1.3, rel=1e-3)
    # 8 m of the law at the end.
    assert bare.forecast.as_planned_m[-1] == pytest.approx(1.3 * 8.0, rel=1e-9)
