"""Integrate a small closure by a general solver: the numbers of `closure_by_crest_and_width.csv`."""

import numpy as np
from scipy.integrate import solve_ivp

PERIOD_S = 12.4206012 * 3600.0
TIDES = 60


def peaks(crest_m, width_m):
    """Return peak heads, velocities and unit discharges, flood then ebb, and the mean basin level, in the last tide."""

    def flow(time_s, basin_m):
        sea_m = 1.5 * np.sin(2.0 * np.pi * time_s / PERIOD_S)
        upper = np.maximum(np.maximum(sea_m, basin_m) - crest_m, 0.0)
        lower = np.maximum(np.minimum(sea_m, basin_m) - crest_m, 0.0)
        depth = np.maximum(lower, 2.0 * upper / 3.0)
        velocity = 0.95 * np.sqrt(2.0 * 9.81 * np.maximum(upper - depth, 0.0)) * np.sign(sea_m - basin_m)
        return sea_m - basin_m, velocity, depth

    def rise(time_s, basin_m):
        _, velocity, depth = flow(time_s, basin_m)
        return velocity * depth * width_m / 2.0e7

    last = np.linspace(TIDES - 1, TIDES, 2001) * PERIOD_S
    found = solve_ivp(rise, (0.0, last[-1]), [max(crest_m, 0.0)], "LSODA", last, rtol=1e-7, atol=1e-8, max_step=120.0)
    head, velocity, depth = flow(found.t, found.y[0])
    rows = [side for row in (head, velocity, velocity * depth) for side in (row.max(), -row.min())]
    return *rows, np.trapezoid(found.y[0], found.t) / PERIOD_S


if __name__ == "__main__":
    crests = [(crest, 500.0) for crest in (-10.0, -6.0, -4.0, -3.0, -2.0, -1.0, 0.0, 0.5)]
    for crest, width in [*crests, *((-10.0, width) for width in (300.0, 200.0, 100.0, 50.0, 20.0))]:
        print(f"{crest:g},{width:g}," + ",".join(f"{value:.4f}" for value in peaks(crest, width)))
