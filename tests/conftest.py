"""Builders shared by all tests."""

from pathlib import Path

import numpy as np
import pytest
from hypothesis import settings
from scipy.integrate import solve_ivp

# The same examples in every run, so that a failure is one of the change at hand.
settings.register_profile("steady", derandomize=True)
settings.load_profile("steady")

PUBLISHED = Path(__file__).parent / "published"


@pytest.fixture(scope="session")
def published():
    """Read a table of published values as a structured array."""

    def read(name):
        rows = [line for line in (PUBLISHED / name).read_text().splitlines() if not line.startswith("#")]
        return np.atleast_1d(np.genfromtxt(rows, delimiter=",", names=True))

    return read


@pytest.fixture(scope="session")
def broad_crest():
    """Return the discharge over a broad crest by hand: m B y sqrt(2 g dh), y the deeper of tailwater and 2/3 head."""

    def discharge(outside_m, inside_m, crest_m, strength_m):
        upper = max(max(outside_m, inside_m) - crest_m, 0.0)
        depth = max(min(outside_m, inside_m) - crest_m, upper / 1.5)
        size = strength_m * depth * (2.0 * 9.81 * max(upper - depth, 0.0)) ** 0.5
        return size if outside_m >= inside_m else -size

    return discharge


@pytest.fixture(scope="session")
def true_levels():
    """Return a router that shares no code with the package: LSODA on area(level) dlevel/dt = flow(outside, level)."""

    def route(time_s, sea, flow, area, start_m):
        solved = solve_ivp(
            lambda time, level: [flow(sea(time), level[0]) / area(level[0])],
            (time_s[0], time_s[-1]),
            [start_m],
            method="LSODA",
            t_eval=time_s,
            rtol=1e-8,
            atol=1e-8,
            max_step=900.0,
        )
        return solved.y[0]

    return route
