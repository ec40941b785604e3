"""An invented study of delays: two stages, two places, weeks 1, 2 and 4; no number is a fact of any site."""

from datetime import UTC, datetime, timedelta
from pathlib import Path

from tidescour.plan.models import Opening, Plan, Site, Stage
from tidescour.plan.models_bed import PlaceBed
from tidescour.study.delay import NOT_KNOWN, DelayRow, DelayStudy, Extra, PlannedPlace

START = datetime(2027, 4, 1, tzinfo=UTC)
WEEKS = (1, 2, 4)
DEPTH_M = {
    ("first", "gap", "sea"): (0.3, 0.4, 0.6),
    ("first", "gap", "basin"): (0.1, 0.3, 0.8),
    ("second", "gap", "sea"): (0.0, 0.0, 0.0),
    ("second", "gap", "basin"): (0.2, 0.5, 1.2),
}


def stage(name, week, **changes):
    entries = {
        "name": name,
        "start": START + timedelta(weeks=week),
        "end": START + timedelta(weeks=week + 1),
        "opening": (Opening(name="gap", crest_level_m=-6.0, width_m=300.0, relation="broad-crest", parameters={}),),
    }
    return Stage(**{**entries, **changes})


def invented_study(depth_m=DEPTH_M):
    """Return a study; lengths are ten times the depths, and on the calendar half of both."""
    places = tuple(
        PlannedPlace(place=_place(side), final_depth_m=depth, required_length_m=10.0 * depth)
        for side, depth in (("sea", 4.0), ("basin", 6.0))
    )
    rows = tuple(
        DelayRow(
            stage=name,
            weeks_late=weeks,
            opening=opening,
            side=side,
            own_stay=Extra(depth_m=depths[at], length_m=10.0 * depths[at]),
            calendar=NOT_KNOWN if name == "second" else Extra(depth_m=depths[at] / 2.0, length_m=5.0 * depths[at]),
        )
        for at, weeks in enumerate(WEEKS)
        for (name, opening, side), depths in depth_m.items()
    )
    return DelayStudy(
        plan=Plan(
            folder=Path("invented"),
            file=Path("invented/plan.toml"),
            site=Site(name="Invented gap", datum="invented datum 2026", latitude_deg=53.4),
            stage=(stage("bound", 0), stage("first", 1), stage("second", 2)),
        ),
        weeks=WEEKS,
        places=places,
        rows=rows,
        files=(),
        findings=(),
    )


def _place(side):
    return PlaceBed(
        opening="gap",
        side=side,
        length_m=90.0,
        bed_level_m=-9.0,
        chezy_m05_s=40.0,
        widening=0.0,
        alpha=None,
        alpha_basis="integral",
        local_velocity_factor=1.0,
        failure_slope_cot=10.0,
        start_depth_m=0.0,
        d50_mm=None,
    )
