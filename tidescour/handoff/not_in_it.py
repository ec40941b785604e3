"""What the numbers do not hold: each thing left out, why it matters, which way it errs, and what to do instead."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final, Literal

Errs = Literal["cautious", "not cautious", "unknown"]


@dataclass(frozen=True, slots=True, kw_only=True)
class LeftOut:
    """One thing that is not in the numbers.

    Parameters
    ----------
    name : str
        Short name in kebab case.
    what : str
        What is left out.
    why : str
        Why it matters at a closure.
    errs : {"cautious", "not cautious", "unknown"}
        Which way leaving it out errs for depth and length: ``not cautious`` gives too little.
    instead : str
        What to do instead.
    told_by : tuple of str
        Codes of the findings that tell a run of it, where it may matter there.
    """

    name: str
    what: str
    why: str
    errs: Errs
    instead: str
    told_by: tuple[str, ...] = ()


NOT_IN_IT: Final = (
    LeftOut(
        name="surge",
        what="storm surge and the wind's set-up, but where levels are measured, given as a series or as a load case",
        why="a surge raises the head, lets water over dams that the tide does not reach, and may do in a day what "
        "weeks of tide do not",
        errs="not cautious",
        instead="give a storm as a level series and as a [[load_case]] after each stage that may meet one",
        told_by=("tide-only",),
    ),
    LeftOut(
        name="waves",
        what="waves and the wash of ships",
        why="they stir sand that the current then carries, lower the threshold, and load stone and filters",
        errs="not cautious",
        instead="in water shallower than half the length of the waves, where they feel the bed, ask a specialist for a "
        "threshold under waves and current; design the stone for waves by itself",
    ),
    LeftOut(
        name="sand-losses",
        what="sand that the current carries away while a dam of sand closes the gap",
        why="in the last stages the loss may come near to what the plant can place, so that the stage lasts longer",
        errs="not cautious",
        instead="estimate the loss by a transport formula at the velocities of velocities.csv, and lengthen the stages",
    ),
    LeftOut(
        name="density-currents",
        what="stratification and density currents",
        why="salt water under fresh water runs faster near the bed than the mean over the depth, and at slack too; "
        "gauges in water of different density stand at different levels for one pressure",
        errs="unknown",
        instead="measure profiles of salinity and velocity at the gap; where the layers stay apart, use a model that "
        "has them, and give its velocity as a series",
    ),
    LeftOut(
        name="placing-of-units",
        what="the motion of caissons or other floating units while they are placed, and the flow around one that hangs "
        "in the gap",
        why="a unit halfway in place narrows the gap and turns the jet, and its velocities are those of no stage",
        errs="not cautious",
        instead="test the placing in a model; give the gap beside a unit as an opening of a short stage of its own",
        told_by=("placing-not-in-it",),
    ),
    LeftOut(
        name="abutment-vortices",
        what="eddies with an upright axis at abutments and dam heads",
        why="holes there have grown more than 1.5 to 2 times as deep as behind the middle of a sill (from memory)",
        errs="not cautious",
        instead="give local_velocity_factor (1.2 to 1.5) or alpha (3 to 4.5) at these places, both from memory, or "
        "better what a model showed; protect around the heads too",
        told_by=("abutment-eddies-not-in-it",),
    ),
    LeftOut(
        name="ice",
        what="ice",
        why="floes pile up in a narrow gap, raise the head and plough the protection",
        errs="not cautious",
        instead="keep the last stages out of the season of ice",
    ),
    LeftOut(
        name="morphology",
        what="bed forms, and the change of channels and shoals around the works",
        why="as the gap narrows channels turn towards it or silt up, and with them the depth at the end of the "
        "protection, the direction of the flow and the storage of the basin",
        errs="unknown",
        instead="sound channels and basin between the stages, and bring bed_level_m and the basin's table up to date",
    ),
    LeftOut(
        name="supply-and-infill",
        what="sand that the flow brings into a hole, and what the opposite tide fills in again",
        why="with sand on the move upstream, and where both tides reach a hole, it grows more slowly than computed",
        errs="cautious",
        instead="compare with soundings (`tidescour soundings`): a growth factor under 1 is then expected",
    ),
    LeftOut(
        name="soil-mechanics",
        what="whether sand liquefies or breaches, and how far a slide runs out again and again",
        why="the required length stands on the slope after one slide that the plan gives; loose sand has run out "
        "flatter than 1 in 20 (from memory)",
        errs="not cautious",
        instead="let soil investigation at the edge of the protection give failure_slope_cot",
    ),
    LeftOut(
        name="sea-raised-by-the-works",
        what="a sea tide that the closure itself changes, and a basin whose level is not the same from end to end",
        why="a closed gap may reflect the tide and raise it in front of the dam, and with it the head",
        errs="not cautious",
        instead="take sea_factor from a model of the estuary, or give its levels as series",
        told_by=("sea-tide-may-rise",),
    ),
)


def not_in_it_objects() -> list[dict[str, str]]:
    """Return what is not in the numbers, ready for JSON, one object each: name, what, why, errs, instead."""
    return [left_out_object(each) for each in NOT_IN_IT]


def left_out_object(each: LeftOut) -> dict[str, str]:
    """Return one thing left out, ready for JSON."""
    return {"name": each.name, "what": each.what, "why": each.why, "errs": each.errs, "instead": each.instead}
