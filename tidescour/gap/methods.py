"""The methods of this step that the plan does not choose between, for the listing and the report."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Final

from tidescour.gap.calibration import estimate
from tidescour.gap.discharges import storage_discharge
from tidescour.gap.limits_basin import level_error
from tidescour.gap.limits_gap import inertia_number
from tidescour.gap.routing import basin_levels
from tidescour.gap.section import control_level
from tidescour.gap.sweep import closure_sweep
from tidescour.table import Entry

METHODS: Final[tuple[Entry[Callable[..., Any]], ...]] = (
    Entry(
        name="control-section",
        title="Control section of any shape: the level at which A sqrt(E - z) is largest, not under the tailwater",
        function=control_level,
        validity="one water level across the section; vertical walls over the ends of a surveyed profile. The sum of "
        "vertical strips, each critical by itself, passes more: 7.6 % for a triangle, tens of per cent for a deep "
        "channel between berms",
        source="Encyclopaedia Britannica, 11th ed. (1910), Hydraulics, section 44; critical depth as in Chow (1959), "
        "Open-Channel Hydraulics, ch. 3 and 4 (from memory)",
        confidence="derived",
    ),
    Entry(
        name="basin-routing",
        title="Basin level through its storage: dV/dt = sum of discharges + inflows",
        function=basin_levels,
        validity="basin short against the tidal wave (about 1/20 of its length), water level in it, no inertia in the "
        "gap, sea tide not changed by the works",
        source="continuity; implicit step of second order after Alexander (1977), SIAM J. Numer. Anal. 14(6)",
        confidence="derived",
    ),
    Entry(
        name="basin-length",
        title="Error of a level basin at its head: 1 / cos(k L) - 1, k = w / sqrt(g h)",
        function=level_error,
        validity="standing wave without friction, M2; friction makes it larger",
        source="long wave in a closed channel of constant depth; derived",
        confidence="derived",
    ),
    Entry(
        name="inertia-number",
        title="Inertia in the gap: K2 = w sqrt(L A_b / (g A_g)), negligible under 0.15",
        function=inertia_number,
        validity="M2; length of the gap along the flow, or of the protections where it is not given",
        source="Keulegan (1967) and King (1974) as in USACE (2002), Coastal Engineering Manual, part II, ch. 6",
        confidence="published",
    ),
    Entry(
        name="spring-neap-sweep",
        title="Peaks by crest level and by width in the spring, mean and neap tide of one spring-neap cycle",
        function=closure_sweep,
        validity="the main opening alone is changed; spring, mean and neap are the tides of largest, median and "
        "smallest range in 14.77 days from the start of the first stage",
        source="the routing above; common practice, no source for the choice of tides",
        confidence="derived",
    ),
    Entry(
        name="calibration",
        title="Coefficient, storage and datum by generalised least squares on levels and measured discharges",
        function=estimate,
        validity="a gap that did not change while the gauges stood; residuals of the levels autoregressive, discharges "
        "with independent errors; a systematic error of all discharges cannot be seen; intervals are linear ones",
        source="least squares with a fitted autoregressive noise (Burg), order by Akaike's criterion; Student's t; "
        "200 simulated cases in tests/gap/calibration_coverage.py",
        confidence="derived",
    ),
    Entry(
        name="discharge-by-storage",
        title="Discharge from the basin level: Q = A dz/dt - inflow, slope of a parabola over an hour",
        function=storage_discharge,
        validity="level basin; five samples at least; the parabola's loss at M2 is put back",
        source="Savitzky and Golay (1964), Anal. Chem. 36(8)",
        confidence="published",
    ),
)
