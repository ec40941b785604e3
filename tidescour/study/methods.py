"""The methods of this step that the plan does not choose between, for the listing and the report."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Final

from tidescour.study.growth_factor import fit_factor
from tidescour.table import Entry, symbols

METHODS: Final[tuple[Entry[Callable[..., Any]], ...]] = (
    Entry(
        name="growth-factor",
        title="Growth factor of a place from its soundings, and the forecast from the last of them",
        function=fit_factor,
        says="ln(f) is normal beforehand, with mean 0 and standard deviation s_f; d normal around h with standard "
        "error s_d\n"
        "for each f the depth h grows from sounding to sounding by f times the law, its variance by (s_g dh)^2 too, "
        "and is brought towards d (Kalman); how well the soundings fit weighs f",
        symbols=symbols(
            ("f", "-", "growth factor, on that of the plan"),
            ("s_f", "-", "soundings.prior_scatter"),
            ("d", "m", "sounded depth"),
            ("h", "m", "depth of the hole"),
            ("s_d", "m", "standard error of the sounding"),
            ("s_g", "-", "soundings.growth_scatter"),
            ("dh", "m", "growth between two soundings"),
        ),
        validity="one factor for all stages of a place; errors of soundings independent of each other: a common one, "
        "as of a datum, is not in the interval; scatter beforehand of 0.3 is a literature value from memory",
        source="Bayes' rule with a Kalman filter for the depth; derived",
        confidence="derived",
        left_by=(
            "soundings-hardly-tell",
            "factor-far-from-expected",
            "soundings-disagree",
            "not-sounded",
            "hindcast-on-tide",
        ),
        leads_to=("factor-in-plan", "stop-reached", "stop-ahead", "slope-not-sounded", "slope-not-forecast"),
    ),
)
