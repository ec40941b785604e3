"""Rules of a plan that need more than one key: stages, their levels and flows, and what a run needs besides."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import pairwise

from tidescour.plan.draft import Draft
from tidescour.plan.kinds import SIDES, Side
from tidescour.plan.models import Opening, StageSpan
from tidescour.plan.models_bed import PlaceOverride
from tidescour.plan.openings import written_names
from tidescour.plan.problems import WHOLE_JOB, KeyPath, Problem, found, key_text, listed, suggestion
from tidescour.plan.rules_names import same_names
from tidescour.plan.rules_series import series_problems

_BASIN_WORDS = {"tide": ("routed", "tide"), "measured": ("routed", "measured")}
"""What the basin may be beside a word for the sea; a series goes with routed or a series."""

_NEEDED_EVERYWHERE = ("length_m", "bed_level_m", "failure_slope_cot")


def a_run_has_stages(draft: Draft) -> Iterator[Problem]:
    """Refuse a run without stages."""
    if not draft.has("stage") and not draft.has("programme"):
        message = "missing; write [[stage]] for each stage, or [programme] with a file"
        yield Problem(path=("stage",), message=message, only_for=WHOLE_JOB)


def stages_follow_each_other(draft: Draft) -> Iterator[Problem]:
    """Refuse stages that run backwards, overlap, stand out of order or share a name."""
    for path, stage in draft.each_with(StageSpan, "start", "end"):
        if stage.start >= stage.end:
            message = f"found {found(stage.end)}, not after start = {found(stage.start)}"
            yield Problem(path=(*path, "end"), message=message)
    yield from same_names(((path, part.name) for path, part in draft.each_with(StageSpan, "name")), "stage")
    for (above, first), (path, second) in pairwise(draft.each_with(StageSpan, "start")):
        name = key_text(above, draft.written)
        if second.start < first.start:
            message = f"starts before {name} above it ({found(first.start)}); put stages in order"
            yield Problem(path=(*path, "start"), message=message)
        elif draft.is_sound(above, "end") and second.start < first.end:
            message = f"found {found(second.start)}, but {name} lasts until {found(first.end)}"
            yield Problem(path=(*path, "start"), message=message)


def planned_dates_run_forwards(draft: Draft) -> Iterator[Problem]:
    """Refuse a stage that was planned to end before it starts."""
    for path, stage in draft.each_with(StageSpan, "planned_start", "planned_end"):
        start, end = stage.planned_start, stage.planned_end
        if start is not None and end is not None and start >= end:
            message = f"found {found(end)}, not after planned_start = {found(start)}"
            yield Problem(path=(*path, "planned_end"), message=message)


def levels_go_together(draft: Draft) -> Iterator[Problem]:
    """Refuse levels without meaning, and two that do not belong to the same days."""
    for path, stage in draft.each_with(StageSpan, "sea", "basin"):
        unknown = [
            *_level_problems(draft, (*path, "sea"), stage.sea, tuple(_BASIN_WORDS)),
            *_level_problems(draft, (*path, "basin"), stage.basin, ("routed", "measured", "tide")),
        ]
        yield from unknown
        allowed = _BASIN_WORDS.get(stage.sea, ("routed",))
        series_beside_series = stage.sea not in _BASIN_WORDS and draft.has("series", stage.basin)
        if not unknown and stage.basin not in allowed and not series_beside_series:
            also = "" if stage.sea in _BASIN_WORDS else " or a level series"
            message = f"found {found(stage.basin)}; sea = {found(stage.sea)} goes with {listed(allowed)}{also}"
            yield Problem(path=(*path, "basin"), message=message)


def _level_problems(draft: Draft, path: KeyPath, source: str, words: tuple[str, ...]) -> Iterator[Problem]:
    if source not in words:
        yield from series_problems(draft, path, source, "level", words)


def levels_have_a_source(draft: Draft) -> Iterator[Problem]:
    """Refuse, for a run, a stage whose levels have no record, constants or storage in the plan."""
    has_sea, has_basin = draft.has("records", "sea"), draft.has("records", "basin")
    has_tide = has_sea or draft.has("tide", "sea_constants")
    lacking = {
        ("sea", "measured"): "" if has_sea else "there is no [records.sea]",
        ("sea", "tide"): "" if has_tide else "there is neither [records.sea] nor tide.sea_constants",
        ("basin", "measured"): "" if has_basin else "there is no [records.basin]",
        ("basin", "tide"): "" if has_basin else "there is no [records.basin]",
        ("basin", "routed"): "" if draft.has("basin") else "there is no [basin] with level_m and area_m2",
    }
    for side in SIDES:
        for path, stage in draft.each_with(StageSpan, side):
            source = getattr(stage, side)
            if lack := lacking.get((side, source)):
                yield Problem(path=(*path, side), message=f'"{source}" needs a source, but {lack}', only_for=WHOLE_JOB)


def places_exist(draft: Draft) -> Iterator[Problem]:
    """Refuse a place whose opening stands in no stage."""
    names = written_names(draft.written, "stage")
    for path, _ in draft.each_with(PlaceOverride):
        if len(path) == 4 and names and path[3] not in names:
            yield Problem(path=path, message=f"no stage has an opening of that name; {suggestion(path[3], names)}")


def protection_is_complete(draft: Draft) -> Iterator[Problem]:
    """Refuse, for a run, a place without protection, bed level, slope, or a way to alpha."""
    openings = _openings_by_name(draft)
    for side in SIDES:
        for key in _NEEDED_EVERYWHERE:
            lacking = [name for name in openings if _lacks(draft, side, name, key)]
            yield from _lacking(side, key, lacking, len(openings), "missing")
        lacking = [
            name
            for name, stages in openings.items()
            if _lacks(draft, side, name, "alpha")
            and _lacks(draft, side, name, "alpha_lengths_m")
            and _lacks(draft, side, name, "chezy_m05_s")
            and not all(draft.has(*path, f"alpha_{side}") for path in stages)
        ]
        message = f"missing; it gives alpha, unless alpha is given here or by length, or alpha_{side} in every stage"
        yield from _lacking(side, "chezy_m05_s", lacking, len(openings), message)


def _openings_by_name(draft: Draft) -> dict[str, list[KeyPath]]:
    """Return the paths of all openings of stages by their name."""
    paths: dict[str, list[KeyPath]] = {}
    for path, opening in draft.each_with(Opening, "name"):
        if path[0] == "stage":
            paths.setdefault(opening.name, []).append(path)
    return paths


def _lacks(draft: Draft, side: Side, opening: str, key: str) -> bool:
    places: tuple[KeyPath, ...] = (("protection", side), ("protection", side, "opening", opening))
    return not any(_may_give(draft, place, key) for place in places)


def _may_give(draft: Draft, place: KeyPath, key: str) -> bool:
    """Tell whether a table gives a key, sound or not; what is written but no table is not missed twice."""
    return draft.has(*place) and (place not in draft.parts or draft.has(*place, key))


def _lacking(side: Side, key: str, names: list[str], of: int, message: str) -> Iterator[Problem]:
    if not names:
        return
    meaning = PlaceOverride.model_fields[key].description
    for_whom = "" if len(names) == of else f", for {listed(names).replace(' or ', ' and ')}"
    yield Problem(path=("protection", side, key), message=f"{message}{for_whom}: {meaning}", only_for=WHOLE_JOB)


def grain_size_is_given(draft: Draft) -> Iterator[Problem]:
    """Refuse, for a run, a place with neither critical velocity nor grain size."""
    if _may_give(draft, ("bed",), "critical_velocity_m_s") or _may_give(draft, ("bed",), "d50_mm"):
        return
    openings = _openings_by_name(draft)
    if not openings or any(_lacks(draft, side, name, "d50_mm") for side in SIDES for name in openings):
        message = "missing; the critical velocity needs it, unless critical_velocity_m_s is given"
        yield Problem(path=("bed", "d50_mm"), message=message, only_for=WHOLE_JOB)
