"""Rules of a plan that need more than one key: stages, their levels and flows, and what a run needs besides."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from itertools import pairwise
from typing import Any

from tidescour.plan.draft import Draft
from tidescour.plan.models import SIDES, Opening, PlaceOverride, Quantity, Series, Side, StageSpan
from tidescour.plan.problems import KeyPath, Problem, found, key_text, listed, suggestion

_BASIN_WORDS = {"tide": ("routed", "tide"), "measured": ("routed", "measured")}
"""What the basin may be beside a word for the sea; a series goes with routed or a series."""

_FLOW_SERIES: dict[str, Quantity] = {"discharge_series": "discharge", "end_velocity_series": "velocity"}
_NEEDED_EVERYWHERE = ("length_m", "bed_level_m", "failure_slope_cot")


def a_run_has_stages(draft: Draft) -> Iterator[Problem]:
    """Refuse a run without stages."""
    if not draft.has("stage") and not draft.has("programme"):
        message = "missing; write [[stage]] for each stage, or [programme] with a file"
        yield Problem(path=("stage",), message=message, only_for="run")


def stages_follow_each_other(draft: Draft) -> Iterator[Problem]:
    """Refuse stages that run backwards, overlap, stand out of order or share a name."""
    for path, stage in draft.each_with(StageSpan, "start", "end"):
        if stage.start >= stage.end:
            message = f"found {found(stage.end)}, not after start = {found(stage.start)}"
            yield Problem(path=(*path, "end"), message=message)
    seen: set[str] = set()
    for path, stage in draft.each_with(StageSpan, "name"):
        if stage.name in seen:
            yield Problem(path=(*path, "name"), message="stands twice; every stage needs a name of its own")
        seen.add(stage.name)
    for (above, first), (path, second) in pairwise(draft.each_with(StageSpan, "start")):
        name = key_text(above, draft.written)
        if second.start < first.start:
            message = f"starts before {name} above it ({found(first.start)}); put stages in order"
            yield Problem(path=(*path, "start"), message=message)
        elif draft.is_sound(above, "end") and second.start < first.end:
            message = f"found {found(second.start)}, but {name} lasts until {found(first.end)}"
            yield Problem(path=(*path, "start"), message=message)


def openings_have_own_names(draft: Draft) -> Iterator[Problem]:
    """Refuse an opening that stands twice in a stage."""
    seen: set[tuple[KeyPath, str]] = set()
    for path, opening in draft.each_with(Opening, "name"):
        if (path[:2], opening.name) in seen:
            yield Problem(path=(*path, "name"), message="stands twice in this stage")
        seen.add((path[:2], opening.name))


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
        yield from _series_problems(draft, path, source, "level", words)


def _series_problems(
    draft: Draft, path: KeyPath, name: str, quantity: Quantity, words: tuple[str, ...] = ()
) -> Iterator[Problem]:
    """Return what is wrong with a named series; nothing where it is written but its quantity is not sound."""
    quantities = {str(other): series.quantity for (_, other), series in draft.each_with(Series, "quantity")}
    if quantities.get(name, quantity) != quantity:
        yield Problem(path=path, message=f'found "{name}", a series of {quantities[name]}; needs one of {quantity}')
    elif not draft.has("series", name):
        choices = [*words, *(other for other, kind in quantities.items() if kind == quantity)]
        message = f"found {found(name)}, but there is no [series.{name}]; {suggestion(name, choices)}"
        yield Problem(path=path, message=message)


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
                yield Problem(path=(*path, side), message=f'"{source}" needs a source, but {lack}', only_for="run")


def flow_has_one_source(draft: Draft) -> Iterator[Problem]:
    """Refuse an opening with neither relation nor given series, or with two of them."""
    numbers = {number.name for wanted in draft.choices.relations.values() for number in wanted}
    for path, _ in draft.each_with(Opening):
        given = [key for key in ("relation", *_FLOW_SERIES) if draft.has(*path, key)]
        if not given:
            message = (
                f"missing; write {listed(draft.choices.relations)}, or give discharge_series or end_velocity_series"
            )
            yield Problem(path=(*path, "relation"), message=message, only_for="run")
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
                yield from _series_problems(draft, (*path, key), name, quantity)
    routed = {path for path, stage in draft.each_with(StageSpan, "basin") if stage.basin == "routed"}
    for path, _ in draft.each_with(Opening):
        if draft.has(*path, "end_velocity_series") and path[:2] in routed:
            message = 'gives no discharge, but basin = "routed" needs one; write another basin level for this stage'
            yield Problem(path=(*path, "end_velocity_series"), message=message)


def places_exist(draft: Draft) -> Iterator[Problem]:
    """Refuse a place whose opening stands in no stage."""
    names = _written_names(draft)
    for path, _ in draft.each_with(PlaceOverride):
        if len(path) == 4 and names and path[3] not in names:
            yield Problem(path=path, message=f"no stage has an opening of that name; {suggestion(path[3], names)}")


def _written_names(draft: Draft) -> list[str]:
    """Return the names of all openings, also of those that are not sound."""
    openings = (opening for stage in _tables_in(draft.written, "stage") for opening in _tables_in(stage, "opening"))
    return [name for opening in openings if isinstance(name := opening.get("name"), str)]


def _tables_in(around: Mapping[str, Any], key: str) -> list[dict[str, Any]]:
    tables = around.get(key)
    return [table for table in tables if isinstance(table, dict)] if isinstance(tables, list) else []


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
            and _lacks(draft, side, name, "chezy_m05_s")
            and not all(draft.has(*path, f"alpha_{side}") for path in stages)
        ]
        message = f"missing; it gives alpha, unless alpha is given here or alpha_{side} in every stage"
        yield from _lacking(side, "chezy_m05_s", lacking, len(openings), message)


def _openings_by_name(draft: Draft) -> dict[str, list[KeyPath]]:
    """Return the paths of all openings by their name."""
    paths: dict[str, list[KeyPath]] = {}
    for path, opening in draft.each_with(Opening, "name"):
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
    yield Problem(path=("protection", side, key), message=f"{message}{for_whom}: {meaning}", only_for="run")


def grain_size_is_given(draft: Draft) -> Iterator[Problem]:
    """Refuse, for a run, a place with neither critical velocity nor grain size."""
    if _may_give(draft, ("bed",), "critical_velocity_m_s") or _may_give(draft, ("bed",), "d50_mm"):
        return
    openings = _openings_by_name(draft)
    if not openings or any(_lacks(draft, side, name, "d50_mm") for side in SIDES for name in openings):
        message = "missing; the critical velocity needs it, unless critical_velocity_m_s is given"
        yield Problem(path=("bed", "d50_mm"), message=message, only_for="run")
