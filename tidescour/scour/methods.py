"""The methods of this step that the plan does not choose between, for the listing and the report."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Final

from tidescour.scour.chain import chain_place
from tidescour.scour.comparison import equal_alphas
from tidescour.scour.cycles import stage_cycles
from tidescour.scour.durations import effective_duration
from tidescour.scour.length import required_length
from tidescour.table import Entry, symbols

METHODS: Final[tuple[Entry[Callable[..., Any]], ...]] = (
    Entry(
        name="cycles",
        title="Tidal cycles from one turn to flood to the next",
        function=stage_cycles,
        says="from one upward zero of the head to the next: zeros count where the head was below -e since the last "
        "one and passes e before the next, over 6 h after the last\n"
        "e = 0.02 m with a measured level, else the smaller of that and 1/20 of the largest head; 1/20 of the largest "
        "value of a given series",
        symbols=symbols(
            ("e", "m", "what a turn must pass; in the unit of a given series"),
        ),
        validity="turns told from noise by 2 cm of head (or a twentieth of the largest) and 6 h",
        source="common practice, no source",
        confidence="common practice",
        left_by=("no-turn",),
    ),
    Entry(
        name="effective-duration",
        title="Hours of the reference velocity that do what the whole tide does",
        function=effective_duration,
        says="integral: t_eff = integral of (E / E_ref)^(q / gamma) (h0 / h_ref)^(r / gamma) dt, E = max(alpha u - "
        "u_c, 0)\n"
        "flow-mean, cycle-mean: t_eff = sum over cycles of M^(1 / gamma) T, M the mean of (E / E_ref)^q (h0 / "
        "h_ref)^r over T",
        symbols=symbols(
            ("t_eff", "h", "effective duration"),
            ("E", "m/s", "excess velocity"),
            ("E_ref", "m/s", "the same at the reference velocity"),
            ("alpha", "-", "disturbance factor"),
            ("u", "m/s", "velocity at the end of the protection"),
            ("u_c", "m/s", "critical velocity"),
            ("h0", "m", "water depth there"),
            ("h_ref", "m", "its mean over the stage"),
            ("q", "-", "exponent of the excess in the growth law"),
            ("r", "-", "exponent of the depth in it"),
            ("gamma", "-", "exponent of the time in it"),
            ("M", "-", "mean over T"),
            ("T", "h", "time with u > 0 in a cycle (flow-mean), or the whole cycle (cycle-mean)"),
        ),
        validity="quasi-steady growth that depends on the present depth only, no infill; integral: the tide chained in "
        "small steps; flow-mean and cycle-mean: handbook averages, which change when the tide is cut in two",
        source="derived from the growth law: d(h^(1/gamma))/dt = (c E^q h0^r)^(1/gamma)",
        confidence="derived",
        left_by=("hole-in-record", "weak-reference", "alpha-basis", "alpha-in-other-rule"),
    ),
    Entry(
        name="alpha-by-rule",
        title="Alpha that each tide rule would need for the depth of the integral",
        function=equal_alphas,
        says="h_rule(k alpha) = h_int(alpha), solved for k",
        symbols=symbols(
            ("h_rule", "m", "depth of a row from a flat bed by that rule"),
            ("h_int", "m", "the same by the integral"),
            ("alpha", "-", "disturbance factor of the row"),
            ("k", "-", "what it must be multiplied by"),
        ),
        validity="factors of 1/20 to 20; where alpha varies in a row, all of it is multiplied alike",
        source="the effective duration above; the limits are common practice, no source",
        confidence="derived",
        left_by=("alpha-basis", "alpha-in-other-rule"),
    ),
    Entry(
        name="chain",
        title="Growth from stage to stage by equivalent time",
        function=chain_place,
        says="h_n = f F_n(t_e + t_n) with h_m = f F_n(t_e), F_n(0) = 0: a stage goes on from the time at which its "
        "own curve has the depth that is there\n"
        "for a power law F_n(t) = A_n t^gamma, and (h_n / f)^(1 / gamma) = (h_0 / f)^(1 / gamma) + sum of A_i^(1 / "
        "gamma) t_i",
        symbols=symbols(
            ("h_n", "m", "depth after stage n"),
            ("h_m", "m", "depth before it"),
            ("h_0", "m", "start_depth_m"),
            ("f", "-", "growth_factor"),
            ("F_n", "m", "growth from a flat bed at the reference of stage n"),
            ("A_n", "m/h^gamma", "coefficient of that growth, c E_ref^q h_ref^r"),
            ("A_i", "m/h^gamma", "the same of stage i"),
            ("t_e", "h", "equivalent start"),
            ("t_n", "h", "effective duration of stage n"),
            ("t_i", "h", "effective duration of stage i"),
            ("gamma", "-", "exponent of the time in the growth law"),
        ),
        validity="growth depends on the present depth only; with one power law for all stages their order does not "
        "matter, with any other law it does",
        source="derived: h_n^(1/gamma) = h_0^(1/gamma) + sum of A_i^(1/gamma) t_i",
        confidence="derived",
        left_by=("gap-between-stages",),
        leads_to=("stop-in-programme", "load-case-stop"),
    ),
    Entry(
        name="required-length",
        title="Length of protection that a slide does not reach past",
        function=required_length,
        says="L = n m h(L), no less than 6 D; h(L) the final depth with alpha, width of the flow and velocity for "
        "that length\n"
        "by a single slide that keeps its area: L = (n - n_0) / 2 m h(L)",
        symbols=symbols(
            ("L", "m", "length of the protection"),
            ("n", "-", "failure_slope_cot"),
            ("m", "-", "depth_margin_factor"),
            ("h", "m", "final depth of the hole"),
            ("D", "m", "highest sill over the bed with flow"),
            ("n_0", "-", "slope 1 in n_0 towards the protection before the slide"),
        ),
        validity="one slide to a slope of 1 in n from the deepest point; n is a geotechnical choice (6 for normally "
        "packed sand, 15 to 20 for loose sand are in use, from memory)",
        source="Dutch closure practice (from memory)",
        confidence="from memory",
        left_by=("minimum-length", "alpha-beyond-table", "slope-before-flatter"),
        leads_to=("protection-too-short", "load-case-too-deep"),
    ),
)
