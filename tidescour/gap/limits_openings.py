"""Where single openings leave the range of their geometry and relation: the findings of one stage."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from tidescour.errors import Finding
from tidescour.gap.layers import extent_at
from tidescour.gap.openings import opening_section
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.gap.relations import RELATIONS
from tidescour.gap.section import control_level, crest_area, energy_discharge, strips_discharge
from tidescour.plan.kinds import SIDES
from tidescour.plan.models import Basin, Opening, Stage
from tidescour.units import SECONDS_PER_HOUR, FloatArray, utc_text

SELDOM_WET = 0.2
CREST_RELATIONS = ("broad-crest", "narrow-crest")
FLAPS = ("ebb-flap", "flood-flap")


def opening_limit_findings(stage: Stage, flow: StageFlow, basin: Basin | None) -> tuple[Finding, ...]:
    """Return what a reader must know about the openings of a stage and those beside the gap.

    Parameters
    ----------
    stage : Stage
        The stage as planned.
    flow : StageFlow
        Its levels and flows.
    basin : Basin or None
        Its side openings.
    """
    beside = () if basin is None else basin.side_opening
    pairs = zip((*stage.opening, *beside), (*flow.openings, *flow.side_openings), strict=True)
    return tuple(
        finding
        for opening, through in pairs
        for findings in (
            profile_findings(opening, through, flow),
            overtopping_findings(opening, through, flow),
            approach_findings(opening, through, flow),
            flap_findings(opening),
        )
        for finding in findings
    )


def _where(opening: Opening, flow: StageFlow) -> str:
    return f"stage {flow.stage!r}, opening {opening.name!r}"


def _upstream(through: OpeningFlow, flow: StageFlow) -> FloatArray:
    """Return the higher of both levels [m above datum]; minus infinity inside holes."""
    return np.where(flow.covered, np.maximum(through.level_sea_m, flow.level_basin_m), -np.inf)


def profile_findings(opening: Opening, through: OpeningFlow, flow: StageFlow) -> Iterator[Finding]:
    """Return a note on what vertical strips would give, and a warning where water stands over a surveyed end.

    Ends that the plan cuts (``profile_from_m``, ``profile_to_m``) are walls by its own word.
    """
    if not opening.profile_points:
        return
    upstream = _upstream(through, flow)
    at = int(np.argmax(upstream))
    level, crest = float(upstream[at]), float(through.crest_level_m[at])
    if level <= crest:
        return
    distance, ground = np.array(opening.profile_points).T
    if opening.relation in CREST_RELATIONS:
        layers = opening_section(opening).layers
        control = control_level(level, crest, crest, layers)
        as_one = energy_discharge(level, control, crest_area(control, crest, layers))
        more = max(strips_discharge(level, distance, ground, crest) / as_one - 1.0, 0.0)
        message = (
            f"the profile is one section with one control level; cut into vertical strips it would pass "
            f"{100.0 * more:.1f} % more at the highest level met, {level:.2f} m (free flow)"
        )
        yield Finding(severity="note", code="profile-as-one", where=_where(opening, flow), message=message)
    ends = ((opening.profile_from_m, 0), (opening.profile_to_m, -1))
    over = [end for cut, end in ends if cut is None and level > ground[end]]
    if over:
        told = " and ".join(f"its end at {distance[end]:g} m ({ground[end]:.2f} m)" for end in over)
        highest = " and its highest point" if level > ground.max() else ""
        message = (
            f"the water reaches {level:.2f} m at {utc_text(flow.time_s[at])}, over {told}{highest}: a vertical wall is "
            "assumed there; survey the profile further up, or say with profile_from_m and profile_to_m where a wall "
            "stands"
        )
        yield Finding(severity="warning", code="profile-end", where=_where(opening, flow), message=message)


def overtopping_findings(opening: Opening, through: OpeningFlow, flow: StageFlow) -> Iterator[Finding]:
    """Return a note where a crest over mean sea level is wet, but seldom."""
    if through.given_end_velocity_m_s is not None:
        return
    covered = flow.covered
    over = _upstream(through, flow) - through.crest_level_m
    wet_s, covered_s = (float(np.trapezoid(where.astype(np.float64), flow.time_s)) for where in (over > 0.0, covered))
    share = wet_s / covered_s
    high = through.crest_level_m.mean() > through.level_sea_m[covered].mean()
    if not high or not 0.0 < share < SELDOM_WET:
        return
    discharge = np.where(covered, through.discharge_m3_s, 0.0)
    peak, deepest = int(np.argmax(np.abs(discharge))), int(np.argmax(over))
    message = (
        f"the crest is overtopped for {wet_s / SECONDS_PER_HOUR:.1f} h ({100.0 * share:.1f} % of the time), by up to "
        f"{over[deepest]:.2f} m at {utc_text(flow.time_s[deepest])}; "
    )
    if discharge[peak] == 0.0:
        message += "nothing passes"
    else:
        way = "into the basin" if discharge[peak] > 0.0 else "out to sea"
        message += f"at most {abs(discharge[peak]):.3g} m3/s pass, {way}, at {utc_text(flow.time_s[peak])}"
    yield Finding(severity="note", code="overtopping", where=_where(opening, flow), message=message)


def _widest(opening: Opening, level_m: float) -> float:
    """Return the larger width at a level [m above datum] of the sections at the start and the end of the stage."""
    return max(extent_at(level_m, opening_section(opening, at_end).layers) for at_end in (False, True))


def approach_findings(opening: Opening, through: OpeningFlow, flow: StageFlow) -> Iterator[Finding]:
    """Return warnings where the approach of a broad crest is counted twice, or is smaller than the opening."""
    sides = [side for side in SIDES if f"approach_width_{side}_m" in opening.parameters]
    coefficient = opening.parameters.get("coefficient", 1.0)
    if sides and coefficient > 1.0:
        message = (
            f"coefficient = {coefficient:g} is over 1 beside an approach width: a coefficient over 1 stands for the "
            "velocity of the approach, which is then counted twice; leave out the approach, or take a coefficient of "
            "at most 1"
        )
        yield Finding(severity="warning", code="approach-twice", where=f"opening {opening.name!r}", message=message)
    for side in sides:
        level = through.level_sea_m if side == "sea" else flow.level_basin_m
        highest = float(level[flow.covered].max())
        width, bed = (opening.parameters[f"approach_{what}_{side}_m"] for what in ("width", "bed"))
        lowest_crest = float(through.crest_level_m.min())
        if highest > lowest_crest and width < (widest := _widest(opening, highest)):
            message = (
                f"approach_width_{side}_m = {width:g} m is less than the opening's own {widest:.4g} m at the highest "
                f"{side} level, {highest:.2f} m; write the width of the channel that leads to it"
            )
            yield Finding(severity="warning", code="approach-width", where=_where(opening, flow), message=message)
        if bed > lowest_crest:
            message = (
                f"approach_bed_{side}_m = {bed:g} m stands over the crest, {lowest_crest:g} m: the approach is then "
                "the higher sill; write the bed in front of the crest, or the crest where it is highest"
            )
            yield Finding(severity="warning", code="approach-bed", where=_where(opening, flow), message=message)


def flap_findings(opening: Opening) -> Iterator[Finding]:
    """Return a note that a flap's opening head and leak are inputs."""
    if opening.relation not in FLAPS:
        return
    defaults = {number.name: number.default for number in RELATIONS[opening.relation].parameters}
    head, leak = (opening.parameters.get(key, defaults[key]) for key in ("opening_head_m", "leak"))
    message = (
        f"opening_head_m = {head:g} m and leak = {leak:g} of the flap are inputs, not computed from its weight and "
        "seals"
    )
    yield Finding(severity="note", code="flap-inputs", where=f"opening {opening.name!r}", message=message)
