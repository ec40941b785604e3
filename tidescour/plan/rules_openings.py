"""Rules of a plan that need more than one key: openings, of stages, beside the gap and of a calibration."""

from __future__ import annotations

from collections.abc import Iterator

from tidescour.plan.draft import Draft
from tidescour.plan.models import Opening, Quantity, StageSpan
from tidescour.plan.openings import KEYS_OF_OTHERS, written_names
from tidescour.plan.problems import KeyPath, Problem, listed, purposes_of
from tidescour.plan.rules_series import series_problems

_FLOW_SERIES: dict[str, Quantity] = {"discharge_series": "discharge", "end_velocity_series": "velocity"}
_OF_A_WIDTH = ("width_m", "width_end_m", "side_slope")
_OF_A_PROFILE = ("profile_from_m", "profile_to_m")


def openings_have_own_names(draft: Draft) -> Iterator[Problem]:
    """Refuse an opening that stands twice in a stage or a list, and a side opening named as one of the gap."""
    seen: set[tuple[KeyPath, str]] = set()
    for path, opening in draft.each_with(Opening, "name"):
        if (path[:-1], opening.name) in seen:
            where = "in this stage" if path[0] == "stage" else f"in [[{path[0]}.{path[1]}]]"
            yield Problem(path=(*path, "name"), message=f"stands twice {where}")
        seen.add((path[:-1], opening.name))
    of_the_gap = written_names(draft.written, "stage", "calibration")
    for path, opening in draft.each_with(Opening, "name"):
        if path[0] == "basin" and opening.name in of_the_gap:
            message = "is the name of an opening of the gap too; a side opening needs a name of its own"
            yield Problem(path=(*path, "name"), message=message)


def openings_have_one_shape(draft: Draft) -> Iterator[Problem]:
    """Refuse an opening with neither width nor profile, or with keys of both."""
    for path, _ in draft.each_with(Opening):
        if draft.has(*path, "profile"):
            for key in (key for key in _OF_A_WIDTH if draft.has(*path, key)):
                yield Problem(path=(*path, key), message="stands beside profile; leave out one of the two")
            if draft.has(*path, "crest_level_end_m") and not draft.has(*path, "crest_level_m"):
                message = "missing; crest_level_end_m needs the crest at the start"
                yield Problem(path=(*path, "crest_level_m"), message=message)
            continue
        if not draft.has(*path, "width_m"):
            message = f"missing: {Opening.model_fields['width_m'].description}"
            yield Problem(path=(*path, "width_m"), message=message, only_for=purposes_of(path))
        for key in (key for key in _OF_A_PROFILE if draft.has(*path, key)):
            yield Problem(path=(*path, key), message="belongs to a profile, and none is given; leave it out")


def profiles_are_open(draft: Draft) -> Iterator[Problem]:
    """Refuse cuts of a profile that run backwards, and a crest under its lowest point."""
    for path, opening in draft.each_with(Opening, *_OF_A_PROFILE):
        start, end = opening.profile_from_m, opening.profile_to_m
        if start is not None and end is not None and start >= end:
            message = f"found {end:g}, not over profile_from_m = {start:g}"
            yield Problem(path=(*path, "profile_to_m"), message=message)
    for key in ("crest_level_m", "crest_level_end_m"):
        for path, opening in draft.each_with(Opening, key):
            crest = getattr(opening, key)
            lowest = min((level for _, level in opening.profile_points), default=None)
            if crest is not None and lowest is not None and crest < lowest:
                message = f"found {crest:g}, under the lowest point of the profile, {lowest:g}"
                remedy = "write the level up to which the bed is filled, or leave it out"
                yield Problem(path=(*path, key), message=f"{message}; {remedy}")


def flow_has_one_source(draft: Draft) -> Iterator[Problem]:
    """Refuse an opening with neither relation nor given series, or with two of them."""
    numbers = {number.name for wanted in draft.choices.relations.values() for number in wanted}
    for path, _ in draft.each_with(Opening):
        others = KEYS_OF_OTHERS[str(path[0])]
        series = [key for key in _FLOW_SERIES if key not in others]
        if not any(draft.has(*path, key) for key in ("relation", *_FLOW_SERIES)):
            instead = f", or give {' or '.join(series)}" if series else ""
            message = f"missing; write {listed(draft.choices.relations)}{instead}"
            yield Problem(path=(*path, "relation"), message=message, only_for=purposes_of(path))
        given = [key for key in ("relation", *series) if draft.has(*path, key)]
        for key in given[1:]:
            yield Problem(path=(*path, key), message=f"stands beside {given[0]}; leave out one of the two")
        if given and given[0] != "relation":
            for key in sorted(key for key in numbers if draft.has(*path, key)):
                message = f"is a number of a relation, and {given[0]} stands instead of one; leave it out"
                yield Problem(path=(*path, key), message=message)


def given_flow_is_known(draft: Draft) -> Iterator[Problem]:
    """Refuse a series of another quantity, and a given velocity where discharge is to be routed."""
    for key, quantity in _FLOW_SERIES.items():
        for path, opening in draft.each_with(Opening, key):
            if (name := getattr(opening, key)) is not None:
                yield from series_problems(draft, (*path, key), name, quantity)
    routed = {path for path, stage in draft.each_with(StageSpan, "basin") if stage.basin == "routed"}
    for path, _ in draft.each_with(Opening):
        if draft.has(*path, "end_velocity_series") and path[:2] in routed:
            message = 'gives no discharge, but basin = "routed" needs one; write another basin level for this stage'
            yield Problem(path=(*path, "end_velocity_series"), message=message)
