"""Rules of a plan that need more than one key: soundings and load cases."""

from __future__ import annotations

from collections.abc import Iterator

from tidescour.plan.draft import Draft
from tidescour.plan.models import StageSpan
from tidescour.plan.models_survey import LoadCase, Sounding
from tidescour.plan.openings import written_names
from tidescour.plan.problems import KeyPath, Problem, found, key_text, purposes_of, suggestion
from tidescour.plan.rules_names import same_names
from tidescour.plan.rules_places import draft_places
from tidescour.plan.rules_series import series_problems

_DEPTHS = ("depth_m", "bed_level_m")


def soundings_are_there(draft: Draft) -> Iterator[Problem]:
    """Refuse, where growth is to be compared with soundings, a plan without any."""
    if not draft.has("sounding") and not draft.has("soundings", "file"):
        message = (
            "missing; write [[sounding]] with date, opening, side, depth_m (or bed_level_m) and standard_error_m, "
            "or soundings.file, a table of these columns"
        )
        yield Problem(path=("sounding",), message=message, only_for=("soundings",))


def soundings_belong_to_places(draft: Draft) -> Iterator[Problem]:
    """Refuse a sounding of no opening of a stage, and a second one of one place at one date."""
    names = written_names(draft.written, "stage")
    for path, sounding in draft.each_with(Sounding, "opening"):
        if names and sounding.opening not in names:
            message = f"found {found(sounding.opening)}; {suggestion(sounding.opening, dict.fromkeys(names))}"
            yield Problem(path=(*path, "opening"), message=message)
    seen: dict[tuple[object, ...], KeyPath] = {}
    for path, sounding in draft.each_with(Sounding, "opening", "side", "date"):
        first = seen.setdefault((sounding.opening, sounding.side, sounding.date), path)
        if first != path:
            message = f"found {found(sounding.date)}, as in {key_text(first, {})}; a place is sounded once at a time"
            yield Problem(path=(*path, "date"), message=message)


def soundings_lie_in_the_programme(draft: Draft) -> Iterator[Problem]:
    """Refuse, where growth is to be compared with soundings, one that is not after the start or is after the end."""
    dated = [stage for _, stage in draft.each_with(StageSpan, "start", "end")]
    if not dated or len(dated) < sum(1 for _ in draft.each_with(StageSpan)):
        return
    start, end = min(stage.start for stage in dated), max(stage.end for stage in dated)
    for path, sounding in draft.each_with(Sounding, "date"):
        if start < sounding.date <= end:
            continue
        if sounding.date > end:
            limit, remedy = f"after the last stage's end at {found(end)}", "add the stage in which it was sounded"
        else:
            limit = f"not after the first stage's start at {found(start)}, from which growth is computed"
            remedy = "give that depth as start_depth_m of its protection"
        message = f"found {found(sounding.date)}, {limit}; {remedy}, or leave the sounding out"
        yield Problem(path=(*path, "date"), message=message, only_for=purposes_of(path))


def soundings_have_one_depth(draft: Draft) -> Iterator[Problem]:
    """Refuse a sounding with neither depth nor level, with both, or with a level over the original bed."""
    for path, _ in draft.each_with(Sounding):
        given = [key for key in _DEPTHS if draft.has(*path, key)]
        if not given:
            message = "missing; give it, or bed_level_m"
            yield Problem(path=(*path, "depth_m"), message=message, only_for=purposes_of(path))
        if len(given) > 1:
            yield Problem(path=(*path, "bed_level_m"), message="stands beside depth_m; leave out one of the two")
    beds = {(place.opening, place.side): place.given(draft, "bed_level_m") for place in draft_places(draft)}
    for path, sounding in draft.each_with(Sounding, "opening", "side", "bed_level_m"):
        bed_at, bed_level_m = beds.get((sounding.opening, sounding.side), ((), None))
        if sounding.bed_level_m is None or bed_level_m is None or not draft.is_sound(bed_at, "bed_level_m"):
            continue
        if sounding.bed_level_m > bed_level_m:
            message = (
                f"found {sounding.bed_level_m:g}, over the original bed at {bed_level_m:g}; "
                "write depth_m = 0 where there is no hole"
            )
            yield Problem(path=(*path, "bed_level_m"), message=message)


def load_cases_follow_stages(draft: Draft) -> Iterator[Problem]:
    """Refuse load cases of one name, after no stage, or without a series of levels."""
    yield from same_names(((path, part.name) for path, part in draft.each_with(LoadCase, "name")), "load case")
    stages = [stage.name for _, stage in draft.each_with(StageSpan, "name")]
    for path, case in draft.each_with(LoadCase, "stage"):
        if stages and case.stage not in stages:
            message = f"found {found(case.stage)}; {suggestion(case.stage, stages)}"
            yield Problem(path=(*path, "stage"), message=message)
    for path, case in draft.each_with(LoadCase, "series"):
        yield from series_problems(draft, (*path, "series"), case.series, "level")
