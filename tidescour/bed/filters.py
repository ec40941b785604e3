"""Closed geometric filters: whether each layer keeps in the one under it, lets its water out and is stable in itself.

For screening only: geotextiles and mattresses are not looked at.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from itertools import pairwise
from typing import Final

from tidescour.bed.stone_records import FilterCheck, FilterScreening, Verdict
from tidescour.errors import Finding
from tidescour.plan.models_bed import Grading
from tidescour.table import Entry, symbols

Ratio = Callable[[Grading, Grading], float]


def retention_ratio(layer: Grading, under: Grading) -> float:
    """d15 of a layer over d85 of the one under it [-]: the smaller, the less gets through."""
    return layer.d15_mm / under.d85_mm


def permeability_ratio(layer: Grading, under: Grading) -> float:
    """d15 of a layer over d15 of the one under it [-]: the larger, the freer its water gets out."""
    return layer.d15_mm / under.d15_mm


def uniformity_ratio(layer: Grading, _: Grading) -> float:
    """d60 over d10 of a layer alone [-]; NaN where one of them is not given."""
    if layer.d60_mm is None or layer.d10_mm is None:
        return math.nan
    return layer.d60_mm / layer.d10_mm


_SIZES = (
    ("d15F", "mm", "size that 15 % of the layer by mass is finer than"),
    ("d85B", "mm", "size that 85 % of the layer under it by mass is finer than"),
    ("d15B", "mm", "size that 15 % of the layer under it by mass is finer than"),
)
_RANGE = "closed filters of grains without cohesion, gradings without gaps; no open filters, no geotextiles"

FILTER_RULES: Final[Mapping[str, Entry[Ratio]]] = {
    entry.name: entry
    for entry in (
        Entry(
            name="filter-retention",
            title="Closed filter, retention: the layer keeps in what is under it",
            function=retention_ratio,
            says="d15F / d85B under 4 (5 is also in use)",
            symbols=symbols(_SIZES[0], _SIZES[1]),
            validity=_RANGE,
            source="Terzaghi's filter rule for 4; 5 from memory",
            confidence="published",
            left_by=("filter-retention-ratio",),
        ),
        Entry(
            name="filter-permeability",
            title="Closed filter, permeability: the layer lets out the water from under it",
            function=permeability_ratio,
            says="d15F / d15B over 5 (4 is also in use)",
            symbols=symbols(_SIZES[0], _SIZES[2]),
            validity=_RANGE,
            source="Terzaghi's filter rule, 4 to 5 (from memory)",
            confidence="from memory",
            left_by=("filter-permeability-ratio",),
        ),
        Entry(
            name="filter-internal",
            title="Internal stability: the layer's own fines stay in it",
            function=uniformity_ratio,
            says="d60 / d10 under 10",
            symbols=symbols(
                ("d60", "mm", "size that 60 % of the layer by mass is finer than"),
                ("d10", "mm", "size that 10 % of the layer by mass is finer than"),
            ),
            validity="gradings without gaps",
            source="common in textbooks on bed protection (from memory)",
            confidence="from memory",
            left_by=("filter-internal-ratio", "filter-not-judged"),
        ),
    )
}
_ALONE: Final = "filter-internal"
_AT_LEAST: Final = "filter-permeability"
_LIMITS: Final[Mapping[str, tuple[float, float]]] = {
    "filter-retention": (4.0, 5.0),
    "filter-permeability": (5.0, 4.0),
    _ALONE: (10.0, 10.0),
}
"""The strict limit of each rule and the other one in use."""

_CODES: Final[Mapping[str, str]] = {
    "filter-retention": "filter-retention-ratio",
    "filter-permeability": "filter-permeability-ratio",
    _ALONE: "filter-internal-ratio",
}
"""The code of the finding that a rule does not hold, its own, so that no other rule is said to be left by it."""


def filter_ratios(layers: Sequence[Grading]) -> FilterScreening:
    """Check the layers of a closed filter by the geometric rules.

    Parameters
    ----------
    layers : sequence of Grading
        The bed first, then each layer upward.

    Returns
    -------
    FilterScreening
        Each layer alone, and each on the one under it, from the bed upward; a warning for every rule that does not
        hold, notes for what lies between two limits in use or is not known. Empty without layers.
    """
    checks = [_check(_ALONE, layer, layer) for layer in layers[:1]]
    for under, layer in pairwise(layers):
        checks += [_check(rule, layer, under) for rule in FILTER_RULES]
    return FilterScreening(
        checks=tuple(checks), findings=tuple(_finding(check) for check in checks if check.holds != "yes")
    )


def _check(rule: str, layer: Grading, under: Grading) -> FilterCheck:
    ratio = FILTER_RULES[rule].function(layer, under)
    limit, other = _LIMITS[rule]
    return FilterCheck(
        layer=layer.name,
        under="" if rule == _ALONE else under.name,
        rule=rule,
        ratio=ratio,
        limit=limit,
        other_limit=other,
        holds=_verdict(ratio, limit, other, at_least=rule == _AT_LEAST),
    )


def _verdict(ratio: float, limit: float, other: float, *, at_least: bool) -> Verdict:
    if math.isnan(ratio):
        return "not known"
    keeps, keeps_other = (ratio > limit, ratio > other) if at_least else (ratio < limit, ratio < other)
    return "yes" if keeps else "between the limits in use" if keeps_other else "no"


def _finding(check: FilterCheck) -> Finding:
    where = f"filter {check.layer!r}" + (f" on {check.under!r}" if check.under else "")
    says = FILTER_RULES[check.rule].says
    if check.holds == "not known":
        message = f"{says}: not judged; give d60_mm and d10_mm of this layer"
        return Finding(severity="note", code="filter-not-judged", where=where, message=message)
    within = "does not hold" if check.holds == "no" else "holds by one of the limits in use alone"
    return Finding(
        severity="warning" if check.holds == "no" else "note",
        code=_CODES[check.rule],
        where=where,
        message=f"the ratio is {check.ratio:.3g}: {says} {within}",
    )
