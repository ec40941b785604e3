"""Where the model leaves its range: all such findings of one stage, with numbers and what to do."""

from __future__ import annotations

from collections.abc import Sequence

from tidescour.errors import Finding
from tidescour.gap.limits_basin import constant_area_findings, length_findings, range_findings, river_findings
from tidescour.gap.limits_gap import inertia_findings, small_head_findings
from tidescour.gap.limits_openings import opening_limit_findings
from tidescour.gap.records import StageFlow
from tidescour.plan.models import Basin, Stage
from tidescour.plan.models_bed import PlaceBed


def limit_findings(
    stage: Stage, flow: StageFlow, basin: Basin | None, places: Sequence[PlaceBed]
) -> tuple[Finding, ...]:
    """Return what a reader must know about the range of the model in one stage.

    Parameters
    ----------
    stage : Stage
        The stage as planned.
    flow : StageFlow
        Its levels and flows.
    basin : Basin or None
        Storage, inflow and side openings; without it, or without a table, what needs storage is not judged.
    places : sequence of PlaceBed
        Protections, whose lengths stand in for a `flow_length_m` that is not given; may be empty.

    Returns
    -------
    tuple of Finding
        In a fixed order. What holds for every stage alike says the same in each, so that it can be told once.
    """
    openings = opening_limit_findings(stage, flow, basin)
    if basin is None or not basin.level_m:
        return (*small_head_findings(flow, None), *openings)
    return (
        *constant_area_findings(flow, basin),
        *range_findings(flow, basin),
        *length_findings(flow, basin),
        *river_findings(flow, basin),
        *small_head_findings(flow, basin),
        *inertia_findings(stage, flow, basin, places),
        *openings,
    )
