"""Which alpha each way of counting a tide would need for the depth that another one gives."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Final

import numpy as np
from scipy.optimize import brentq

from tidescour.bed.history import place_name
from tidescour.bed.records import BedHistory
from tidescour.errors import Finding
from tidescour.plan.kinds import TideRule
from tidescour.plan.models import Stage
from tidescour.plan.models_bed import PlaceBed
from tidescour.scour.durations import row_growth
from tidescour.scour.laws import GrowthLaw
from tidescour.scour.records import RULES, CycleSet, Rule
from tidescour.scour.samples import row_samples

MOST: Final = 20.0
"""Largest factor on alpha that is tried (common practice, no source)."""

MISSED: Final = 5e-3
"""Share by which the growth found may miss the one wanted."""


def equal_alphas(bed: BedHistory, cycles: CycleSet, law: GrowthLaw, alpha: float) -> tuple[float, ...]:
    """Alpha that each rule would need to give a row, from a flat bed, the depth of the integral rule.

    An alpha that was found from soundings with one rule is that rule's own; put into another it gives another depth.

    Parameters
    ----------
    bed, cycles, law
        As in `effective_duration`.
    alpha : float
        Alpha of the row's reference; NaN in a row without flow.

    Returns
    -------
    tuple of float
        In the order of `RULES`; where alpha varies in the row, all of it is multiplied alike. NaN where nothing moves,
        or where no factor from 1/20 to 20 serves, as in the jump of a saturating law.
    """
    growth = _growth(bed, cycles, law)
    wanted = growth("integral", 1.0) if alpha > 0.0 else 0.0
    factors = (1.0 if rule == "integral" else _equal_factor(growth, rule, wanted) for rule in RULES)
    return tuple(alpha * factor if wanted > 0.0 else float("nan") for factor in factors)


def alpha_in_rule(bed: BedHistory, cycles: CycleSet, law: GrowthLaw, basis: Rule, rule: Rule) -> float:
    """Alpha that one rule needs to give a row, from a flat bed, the depth that another gives with the row's alpha.

    Parameters
    ----------
    bed, cycles, law
        As in `effective_duration`.
    basis : str
        Rule that the row's alpha belongs to.
    rule : str
        Rule that an alpha is sought for.

    Returns
    -------
    float
        That of the mean crest; NaN where nothing moves, or where no factor from 1/20 to 20 serves.
    """
    if not bed.alpha_ref > 0.0:
        return float("nan")
    if rule == basis:
        return bed.alpha_ref
    growth = _growth(bed, cycles, law)
    return bed.alpha_ref * _equal_factor(growth, rule, growth(basis, 1.0))


def alpha_basis_findings(
    place: PlaceBed,
    stages: Sequence[Stage],
    beds: Sequence[BedHistory],
    cycles: Sequence[CycleSet],
    law: GrowthLaw,
    driving: TideRule,
) -> tuple[Finding, ...]:
    """Tell what the given alphas of a place are worth in the rule that drives growth.

    Parameters
    ----------
    place : PlaceBed
        With the rule that its alphas were found with.
    stages, beds, cycles : sequences of one length
        Rows of the place.
    law : GrowthLaw
        Growth law.
    driving : {"integral", "flow-mean", "cycle-mean"}
        Rule that drives growth.

    Returns
    -------
    tuple of Finding
        One note where the rules differ and alpha is given in some stage where the bed moves, else none.
    """
    if place.alpha_basis == driving:
        return ()
    rows = [row for row in zip(stages, beds, cycles, strict=True) if _alpha_is_given(row[0], place)]
    needed = [(bed, alpha_in_rule(bed, own, law, place.alpha_basis, driving)) for _, bed, own in rows]
    told = [f"{alpha:.3g} instead of {bed.alpha_ref:.3g} in stage {bed.stage!r}" for bed, alpha in needed if alpha > 0]
    if not told:
        return ()
    return (
        Finding(
            severity="note",
            code="alpha-in-other-rule",
            where=place_name(place.opening, place.side),
            message=(
                f"for the depth that {place.alpha_basis}, with which alpha was found, gives from a flat bed, "
                f"{driving} needs {', '.join(told)}"
            ),
        ),
    )


def _alpha_is_given(stage: Stage, place: PlaceBed) -> bool:
    planned = next(each for each in stage.opening if each.name == place.opening)
    of_stage = planned.alpha_basin if place.side == "basin" else planned.alpha_sea
    return of_stage is not None or place.alpha is not None or bool(place.alpha_lengths_m)


_Growth = Callable[[Rule, float], float]


def _growth(bed: BedHistory, cycles: CycleSet, law: GrowthLaw) -> _Growth:
    """Return what gives a row's growth from a flat bed under a rule, with alpha times a factor."""
    samples = row_samples(bed, cycles)
    peak = float(np.max(bed.velocity_m_s[bed.covered], initial=0.0))

    def growth(rule: Rule, factor: float) -> float:
        return _total(row_growth(bed, law, samples, peak, (rule,), factor)[rule], law)

    return growth


def _equal_factor(growth: _Growth, rule: Rule, wanted: float) -> float:
    """Return the factor on alpha with which a rule gives the growth that is wanted; NaN where none does."""
    if not wanted > 0.0:
        return float("nan")

    def missing(logarithm: float) -> float:
        return growth(rule, float(np.exp(logarithm))) / wanted - 1.0

    low, high = -np.log(MOST), np.log(MOST)
    if not missing(high) > 0.0 > missing(low):
        return float("nan")
    found = float(brentq(missing, low, high, xtol=1e-9))
    # Where a saturating law jumps, the growth that is wanted may lie in the jump.
    return float(np.exp(found)) if abs(missing(found)) < MISSED else float("nan")


def _total(grown: np.ndarray, law: GrowthLaw) -> float:
    """Return what a row grows from a flat bed: the state of a power law, else the depth."""
    return float(np.sum(grown)) if law.is_power else float(grown[-1]) if grown.size else 0.0
