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
from tidescour.gap.volume import half_tide_volumes
from tidescour.table import Entry, symbols

METHODS: Final[tuple[Entry[Callable[..., Any]], ...]] = (
    Entry(
        name="control-section",
        title="Control section of any shape",
        function=control_level,
        says="A(z) sqrt(E - z) is largest at z_c: E - z_c = A / (2 T); z = z_c, or the tailwater where it is higher\n"
        "2/3 of the energy over the crest for a rectangle, 4/5 for a triangle",
        symbols=symbols(
            ("z", "m", "level in the control section above the datum"),
            ("z_c", "m", "critical level"),
            ("E", "m", "energy level upstream above the datum"),
            ("A", "m2", "area of the section under the level"),
            ("T", "m", "width of the section at the level"),
        ),
        validity="one water level across the section; vertical walls over the ends of a surveyed profile. The sum of "
        "vertical strips, each critical by itself, passes more: 7.6 % for a triangle, tens of per cent for a deep "
        "channel between berms",
        source="Encyclopaedia Britannica, 11th ed. (1910), Hydraulics, section 44; critical depth as in Chow (1959), "
        "Open-Channel Hydraulics, ch. 3 and 4 (from memory)",
        confidence="derived",
        left_by=("profile-end", "profile-as-one"),
    ),
    Entry(
        name="basin-routing",
        title="Basin level through its storage",
        function=basin_levels,
        says="dV(z) / dt = sum of Q(z_s, z) + q, V(z) = integral of A(z) dz",
        symbols=symbols(
            ("V", "m3", "water stored under the level z"),
            ("z", "m", "basin level above the datum"),
            ("Q", "m3/s", "discharge of an opening by its relation, positive from sea to basin"),
            ("z_s", "m", "sea level at that opening above the datum"),
            ("q", "m3/s", "inflows and given discharges"),
            ("A", "m2", "wet area of the basin by level"),
        ),
        validity="basin short against the tidal wave (about 1/20 of its length), water level in it, no inertia in the "
        "gap, sea tide not changed by the works",
        source="continuity; implicit step of second order after Alexander (1977), SIAM J. Numer. Anal. 14(6)",
        confidence="derived",
        left_by=("basin-level-range", "basin-length", "constant-area", "inertia", "river-ponds", "start-in-hole"),
        leads_to=("small-head", "sea-tide-may-rise"),
    ),
    Entry(
        name="basin-length",
        title="Error of a level basin at its head",
        function=level_error,
        says="e = 1 / cos(k L) - 1, k = w / sqrt(g h); endless from k L = pi / 2 on",
        symbols=symbols(
            ("e", "-", "tide at the head over that at the gap, less 1"),
            ("k", "1/m", "wave number of M2"),
            ("L", "m", "length of the basin along the tide"),
            ("w", "rad/s", "frequency of M2"),
            ("h", "m", "mean depth of the basin"),
            ("g", "m/s2", "9.81"),
        ),
        validity="standing wave without friction, M2; friction makes it larger",
        source="long wave in a closed channel of constant depth; derived",
        confidence="derived",
        left_by=("basin-length",),
    ),
    Entry(
        name="inertia-number",
        title="Inertia in the gap",
        function=inertia_number,
        says="K2 = w sqrt(L A_b / (g A_g)); it matters where K2^2 Q / (w a A_b) is over 0.15^2",
        symbols=symbols(
            ("K2", "-", "inertia number"),
            ("w", "rad/s", "frequency of M2"),
            ("L", "m", "length of the gap along the flow"),
            ("A_b", "m2", "wet area of the basin"),
            ("A_g", "m2", "area of the gap"),
            ("Q", "m3/s", "half the range of the discharge"),
            ("a", "m", "half the range of the sea"),
            ("g", "m/s2", "9.81"),
        ),
        validity="M2; length of the gap along the flow, or of the protections where it is not given",
        source="Keulegan (1967) and King (1974) as in USACE (2002), Coastal Engineering Manual, part II, ch. 6",
        confidence="published",
        left_by=("inertia",),
    ),
    Entry(
        name="spring-neap-sweep",
        title="Peaks by crest level and by width in the spring, mean and neap tide of one spring-neap cycle",
        function=closure_sweep,
        says="by tide and direction the largest |z_s - z|, |Q| / A and |Q| / B, the basin routed anew for each crest "
        "level and each width",
        symbols=symbols(
            ("z_s", "m", "sea level above the datum"),
            ("z", "m", "basin level above the datum"),
            ("Q", "m3/s", "discharge of the opening"),
            ("A", "m2", "area of its control section"),
            ("B", "m", "mean width of it"),
        ),
        validity="the main opening alone is changed; spring, mean and neap are the tides of largest, median and "
        "smallest range in 14.77 days from the start of the first stage",
        source="the routing above; common practice, no source for the choice of tides",
        confidence="derived",
        left_by=("not-swept",),
    ),
    Entry(
        name="volume-check",
        title="Water that passed the gap by the head against water that the storage took up",
        function=half_tide_volumes,
        says="ratio = sum of |integral of Q dt| / sum of |V_2 - V_1 - integral of q dt|, sums over half tides from "
        "zero to zero of the head; 0.85 to 1.15 passes",
        symbols=symbols(
            ("ratio", "-", "what passed over what was taken up"),
            ("Q", "m3/s", "discharge of all openings"),
            ("V_1", "m3", "water stored in the basin at the start of a half tide"),
            ("V_2", "m3", "the same at its end"),
            ("q", "m3/s", "inflows"),
        ),
        validity="stages whose basin level is given; level basin; the limits are common practice, no source",
        source="continuity",
        confidence="derived",
        left_by=("volume-check", "volume-not-checked"),
    ),
)

CALIBRATION_METHODS: Final[tuple[Entry[Callable[..., Any]], ...]] = (
    Entry(
        name="calibration",
        title="Coefficient, storage and datum by generalised least squares on levels and measured discharges",
        function=estimate,
        says="least sum of (W (z_m - z(p)))^2 + ((Q_m - Q(p)) / s)^2 over p, of which the plan chooses: coefficient, "
        "area factor, datum offset",
        symbols=symbols(
            ("p", "-", "what is fitted; the offset in m"),
            ("z_m", "m", "recorded basin level above the datum"),
            ("z", "m", "routed basin level"),
            ("W", "1/m", "filter that makes the residual of the levels white"),
            ("Q_m", "m3/s", "measured discharge"),
            ("Q", "m3/s", "routed discharge"),
            ("s", "m3/s", "standard error of the measured one"),
        ),
        validity="a gap that did not change while the gauges stood; residuals of the levels autoregressive, discharges "
        "with independent errors; a systematic error of all discharges cannot be seen; intervals are linear ones",
        source="least squares with a fitted autoregressive noise (Burg), order by Akaike's criterion; Student's t; "
        "200 simulated cases in tests/gap/calibration_coverage.py",
        confidence="derived",
        left_by=(
            "not-determined",
            "tied-parameters",
            "at-odds-with-physics",
            "tidal-residual",
            "discharges-disagree",
            "weak-signal",
            "not-settled",
            "basin-drifts",
            "storage-kept",
            "nothing-held-back",
            "no-better-than-guess",
        ),
    ),
    Entry(
        name="discharge-by-storage",
        title="Discharge from the basin level, its slope that of a parabola over an hour",
        function=storage_discharge,
        says="Q = A(z) (dz / dt) - q",
        symbols=symbols(
            ("Q", "m3/s", "discharge of all openings, positive from sea to basin"),
            ("A", "m2", "wet area of the basin"),
            ("z", "m", "smoothed basin level above the datum"),
            ("q", "m3/s", "inflows"),
        ),
        validity="level basin; five samples at least; the parabola's loss at M2 is put back",
        source="Savitzky and Golay (1964), Anal. Chem. 36(8)",
        confidence="published",
        left_by=("head-and-storage-disagree",),
    ),
)
