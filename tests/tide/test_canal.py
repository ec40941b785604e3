"""Published currents in a sea-level canal against a velocity from the published tides at both its ends.

The velocity is coefficient x sign(head) sqrt(2 g |head|), head the level at the west end (Gray Gables) minus that at
the east end (Sandwich); the current is taken as published, positive flood. Over 60 days at 10 min steps the best lag of
the current behind the head, found to 5 min, the coefficient there and the correlation are

    east end    (COD0901)  25 min  0.320  0.987
    Bournedale  (COD0903)  35 min  0.327  0.987
    west end    (ca0101)   35 min  0.350  0.986

The canal is some 11 km long, so its coefficient holds the friction of its length and its lag the inertia of its water:
without the lag the correlation is 0.94 to 0.96. Mean levels at the two ends share no datum and are left out.
"""

import numpy as np
import pytest

from tidescour.tide.library import AGENCY_NAMES, predicted_tide
from tidescour.tide.records import TideConstants
from tidescour.units import GRAVITY_M_S2

M_S_PER_KNOT = 1852.0 / 3600.0
LAGS_MIN = np.arange(0.0, 61.0, 5.0)


@pytest.fixture
def station(published):
    """Return the published constants of one station."""
    rows = published("noaa_canal_constants.csv")

    def of(name):
        own = [row for row in rows if row["station"] == name]
        return TideConstants(
            constituents=tuple(AGENCY_NAMES.get(row["constituent"], row["constituent"]) for row in own),
            amplitude_m=[float(row["amplitude"]) for row in own],
            phase_deg=[float(row["phase_deg"]) for row in own],
            mean_m=0.0,
            latitude_deg=float(own[0]["latitude_deg"]),
        )

    return of


@pytest.mark.parametrize("place", ["COD0901", "COD0903", "ca0101"])
def test_currents_follow_the_root_of_the_head(station, place):
    time_s = 1.4516e9 + np.arange(0.0, 60.0 * 86400.0, 600.0)
    current_m_s = predicted_tide(station(place), time_s) * M_S_PER_KNOT
    # The head on a grid of 5 min, so that each lag is a shift of it.
    fine_s = np.arange(time_s[0] - 3600.0, time_s[-1] + 1.0, 300.0)
    head_m = predicted_tide(station("8447295"), fine_s) - predicted_tide(station("8447180"), fine_s)
    orifice_m_s = np.sign(head_m) * np.sqrt(2.0 * GRAVITY_M_S2 * np.abs(head_m))
    lagged_m_s = {lag_min: np.interp(time_s - 60.0 * lag_min, fine_s, orifice_m_s) for lag_min in LAGS_MIN}
    correlation = {lag_min: np.corrcoef(each, current_m_s)[0, 1] for lag_min, each in lagged_m_s.items()}
    best_min = max(correlation, key=correlation.get)
    coefficient = lagged_m_s[best_min] @ current_m_s / (lagged_m_s[best_min] @ lagged_m_s[best_min])
    assert correlation[best_min] > 0.98
    assert 0.93 < correlation[0.0] < 0.97
    assert 20.0 <= best_min <= 40.0
    assert 0.30 < coefficient < 0.37


def test_the_head_between_the_ends_is_the_difference_of_the_published_tides(station):
    # M2 1.251 m at 109.3 degrees in the east, 0.530 m at 28.7 in the west: by the cosine rule 1.276 m.
    east, west = (station(name) for name in ("8447180", "8447295"))
    amplitudes_m = [each.amplitude_m[each.constituents.index("M2")] for each in (east, west)]
    phases_deg = [each.phase_deg[each.constituents.index("M2")] for each in (east, west)]
    head_m = abs(
        amplitudes_m[1] * np.exp(1j * np.radians(phases_deg[1]))
        - amplitudes_m[0] * np.exp(1j * np.radians(phases_deg[0]))
    )
    assert head_m == pytest.approx(1.276, abs=1e-3)
