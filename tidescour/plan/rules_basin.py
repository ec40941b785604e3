"""Rules of a plan that need more than one key: the basin's storage and inflows, and the calibration."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import pairwise

from tidescour.plan.draft import Draft
from tidescour.plan.models import Basin, Inflow, Opening
from tidescour.plan.models_calibration import ALL_OPENINGS, CalibrationSpan, Discharge
from tidescour.plan.named_files import STORAGE_COLUMNS
from tidescour.plan.openings import written_names
from tidescour.plan.problems import Problem, found, listed, purposes_of, suggestion
from tidescour.plan.rules_names import same_names
from tidescour.plan.rules_series import series_problems

_NEEDED_TO_CALIBRATE = {
    ("records", "sea"): "a calibration needs the sea level as it was: write [records.sea]",
    ("records", "basin"): "a calibration needs the basin level as it was: write [records.basin]",
    ("basin",): "a calibration needs the storage of the basin: write [basin] with level_m and area_m2",
    ("calibration",): "write [calibration] with start, end, fit and [[calibration.opening]]",
}


def storage_has_one_source(draft: Draft) -> Iterator[Problem]:
    """Refuse a basin with neither lists nor table, or with both."""
    if ("basin",) not in draft.parts:
        return
    lists = [key for key in ("level_m", *STORAGE_COLUMNS) if draft.has("basin", key)]
    if draft.has("basin", "table"):
        for key in lists:
            yield Problem(path=("basin", key), message="stands beside table; leave out one of the two")
        return
    if draft.has("basin", "table_column"):
        yield Problem(path=("basin", "table_column"), message="belongs to basin.table, and none is given; leave it out")
    missing = [key for key in ("level_m",) if key not in lists]
    if not set(STORAGE_COLUMNS) & set(lists):
        missing.append("area_m2")
    for key in missing:
        also = {"level_m": "", "area_m2": ", or volume_m3"}[key] + ", or a table"
        message = f"missing{also}: {Basin.model_fields[key].description}"
        yield Problem(path=("basin", key), message=message, only_for=purposes_of(("basin",)))
    if set(STORAGE_COLUMNS) <= set(lists):
        yield Problem(path=("basin", "volume_m3"), message="stands beside area_m2; leave out one of the two")


def basin_grows_with_its_level(draft: Draft) -> Iterator[Problem]:
    """Refuse levels or volumes that do not increase, areas that decrease, and lists of two lengths."""
    for key in STORAGE_COLUMNS:
        for path, basin in draft.each_with(Basin, "level_m", key):
            values = getattr(basin, key)
            if values and basin.level_m and len(values) != len(basin.level_m):
                message = f"has {len(values)} values where level_m has {len(basin.level_m)}"
                yield Problem(path=(*path, key), message=message)
    for path, basin in draft.each_with(Basin, "level_m"):
        for position, (below, above) in enumerate(pairwise(basin.level_m), start=1):
            if above <= below:
                message = f"found {above:g} after {below:g}; levels must increase"
                yield Problem(path=(*path, "level_m", position), message=message)
    for path, basin in draft.each_with(Basin, "area_m2"):
        for position, (below, above) in enumerate(pairwise(basin.area_m2), start=1):
            if above < below:
                message = f"found {above:g} after {below:g}; the wet area cannot decrease with the level"
                yield Problem(path=(*path, "area_m2", position), message=message)
    for path, basin in draft.each_with(Basin, "volume_m3"):
        for position, (below, above) in enumerate(pairwise(basin.volume_m3), start=1):
            if above <= below:
                message = f"found {above:g} after {below:g}; the volume must increase with the level"
                yield Problem(path=(*path, "volume_m3", position), message=message)


def inflows_have_one_source(draft: Draft) -> Iterator[Problem]:
    """Refuse an inflow with neither discharge nor series, with both, or with the name of another."""
    yield from same_names(((path, part.name) for path, part in draft.each_with(Inflow, "name")), "inflow")
    for path, _ in draft.each_with(Inflow):
        given = [key for key in ("discharge_m3_s", "series") if draft.has(*path, key)]
        if not given:
            message = "missing; give it, or a series of discharge"
            yield Problem(path=(*path, "discharge_m3_s"), message=message, only_for=purposes_of(path))
        if len(given) > 1:
            yield Problem(path=(*path, "series"), message="stands beside discharge_m3_s; leave out one of the two")
    for path, inflow in draft.each_with(Inflow, "series"):
        if inflow.series is not None:
            yield from series_problems(draft, (*path, "series"), inflow.series, "discharge")


def a_calibration_has_its_records(draft: Draft) -> Iterator[Problem]:
    """Refuse, for a calibration, a plan without both records, the basin or the gap of then."""
    for path, needs in _NEEDED_TO_CALIBRATE.items():
        if not draft.has(*path):
            yield Problem(path=path, message=f"missing; {needs}", only_for=("calibrate",))


def calibration_has_something_to_find(draft: Draft) -> Iterator[Problem]:
    """Refuse a span that runs backwards, a number that is fitted twice, and a coefficient that no opening has."""
    for path, span in draft.each_with(CalibrationSpan, "start", "end"):
        if span.start >= span.end:
            message = f"found {found(span.end)}, not after start = {found(span.start)}"
            yield Problem(path=(*path, "end"), message=message)
    for path, span in draft.each_with(CalibrationSpan, "fit"):
        for position, name in enumerate(span.fit):
            if name in span.fit[:position]:
                yield Problem(path=(*path, "fit", position), message=f'"{name}" stands twice')
        relations = _calibrated_relations(draft)
        with_coefficient = _with_coefficient(draft)
        if "coefficient" in span.fit and relations and not relations & with_coefficient:
            message = (
                'found "coefficient", but no relation of [[calibration.opening]] has one; '
                f"{listed(sorted(with_coefficient))} would"
            )
            yield Problem(path=(*path, "fit", span.fit.index("coefficient")), message=message)


def _with_coefficient(draft: Draft) -> set[str]:
    relations = draft.choices.relations.items()
    return {name for name, wanted in relations if any(number.name == "coefficient" for number in wanted)}


def _calibrated_relations(draft: Draft) -> set[str]:
    """Return the relations of the gap of then; none where one of them is missing or not known."""
    openings = [opening for path, opening in draft.each_with(Opening, "relation") if path[0] == "calibration"]
    relations = {opening.relation for opening in openings if opening.relation is not None}
    known = len(relations) > 0 and relations <= set(draft.choices.relations)
    return relations if known and all(opening.relation for opening in openings) else set()


def discharges_belong_to_the_calibration(draft: Draft) -> Iterator[Problem]:
    """Refuse discharges of another time than the calibration's, and of openings that it does not have."""
    for at, opening in draft.each_with(Opening, "name"):
        if at[0] != "stage" and opening.name == ALL_OPENINGS:
            message = "means all openings together where a discharge names it; choose another name"
            yield Problem(path=(*at, "name"), message=message)
    spans = [span for _, span in draft.each_with(CalibrationSpan, "start", "end")]
    for path, discharge in draft.each_with(Discharge, "time"):
        for span in spans:
            if not span.start <= discharge.time < span.end:
                message = f"found {found(discharge.time)}, outside the calibration: {found(span.start)} up to "
                yield Problem(path=(*path, "time"), message=f"{message}{found(span.end)}")
    names = written_names(draft.written, "calibration", "basin")
    for path, discharge in draft.each_with(Discharge, "opening"):
        if draft.has("calibration", "opening") and discharge.opening not in ("", ALL_OPENINGS, *names):
            choices = [*dict.fromkeys(names), ALL_OPENINGS]
            message = f"found {found(discharge.opening)}; {suggestion(discharge.opening, choices)}"
            yield Problem(path=(*path, "opening"), message=message)
