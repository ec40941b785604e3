"""What the tables of all steps offer: to a plan, and to the list of methods."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from tidescour.bed import methods as bed_methods
from tidescour.bed.filters import FILTER_RULES
from tidescour.bed.shields import SHIELDS
from tidescour.bed.spreading import SPREADINGS
from tidescour.bed.stone import STABILITY
from tidescour.bed.threshold import PROFILES
from tidescour.gap import methods as gap_methods
from tidescour.gap.relations import RELATIONS
from tidescour.gauge.checks import CHECKS
from tidescour.gauge.layouts import LAYOUTS
from tidescour.plan.choices import Choices
from tidescour.scour import methods as scour_methods
from tidescour.scour.laws import LAWS
from tidescour.study import methods as study_methods
from tidescour.table import Entry
from tidescour.tide import methods as tide_methods
from tidescour.tide.library import constituent_names


def plan_choices() -> Choices:
    """Return what the tables of all steps offer to a plan."""
    return Choices(
        layouts=tuple(LAYOUTS),
        shields=tuple(SHIELDS),
        profiles=tuple(PROFILES),
        spreadings=tuple(SPREADINGS),
        laws=tuple(LAWS),
        constituents=constituent_names(),
        relations={name: entry.parameters for name, entry in RELATIONS.items()},
    )


def method_entries() -> tuple[Entry[Callable[..., Any]], ...]:
    """Return the methods of all steps in their order, chosen by the plan or not."""
    return (
        *CHECKS.values(),
        *tide_methods.METHODS,
        *RELATIONS.values(),
        *gap_methods.METHODS,
        *gap_methods.CALIBRATION_METHODS,
        *SHIELDS.values(),
        *PROFILES.values(),
        *SPREADINGS.values(),
        *bed_methods.METHODS,
        *LAWS.values(),
        *scour_methods.METHODS,
        *study_methods.METHODS,
        *STABILITY.values(),
        *FILTER_RULES.values(),
    )
