"""What the steps after the flows do at one place, for any length of its protection and any change of its inputs."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np

from tidescour.bed.history import bed_history, grain_size_mm
from tidescour.bed.layers import BedLayers, bed_layers
from tidescour.bed.records import BedHistory
from tidescour.bed.slope import upstream_slope_cot
from tidescour.bed.water import submerged_relative_density
from tidescour.errors import DomainError
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.handoff.records import DurationRow, PlaceResult
from tidescour.plan.kinds import Side
from tidescour.plan.models import Plan, Stage
from tidescour.plan.models_bed import BedLayer, PlaceBed
from tidescour.plan.places import places
from tidescour.scour.chain import growth_curve
from tidescour.scour.comparison import equal_alphas
from tidescour.scour.cycles import stage_cycles
from tidescour.scour.durations import effective_duration
from tidescour.scour.laws import GrowthLaw
from tidescour.scour.length import (
    allowed_depth,
    chained,
    length_curve,
    main_row,
    minimum_length,
    required_length,
    time_reached,
)
from tidescour.scour.records import RULES, ChainStep, CycleSet, EffectiveDuration, RequiredLength, RowDurations, Rule


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Visit:
    """One stage of one opening, with the cycles that both sides share, whatever the length of the protection."""

    stage: Stage
    flow: StageFlow
    opening: OpeningFlow
    cycles: CycleSet


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PlaceCase:
    """All that the rows of one place follow from."""

    plan: Plan
    place: PlaceBed
    layers: BedLayers
    law: GrowthLaw
    visits: tuple[Visit, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Change:
    """What a row is changed by, each a factor: velocity and alpha at the end of the protection, threshold, hours."""

    velocity: float = 1.0
    alpha: float = 1.0
    critical_velocity: float = 1.0
    hours: float = 1.0


UNCHANGED = Change()


def visits(flows: tuple[StageFlow, ...], stages: tuple[Stage, ...], name: str) -> tuple[Visit, ...]:
    """Return the stages in which an opening stands."""
    return tuple(
        Visit(stage=stage, flow=flow, opening=opening, cycles=stage_cycles(flow, opening))
        for stage, flow in zip(stages, flows, strict=True)
        for opening in flow.openings
        if opening.name == name
    )


def place_cases(plan: Plan, law: GrowthLaw, visited: Mapping[str, tuple[Visit, ...]]) -> tuple[PlaceCase, ...]:
    """Return every place of a plan with what it is computed from."""
    return tuple(
        PlaceCase(
            plan=plan,
            place=_without_idle_table(place, visited[place.opening]),
            layers=bed_layers(place, plan.bed),
            law=law,
            visits=visited[place.opening],
        )
        for place in places(plan)
    )


def _without_idle_table(place: PlaceBed, visited: tuple[Visit, ...]) -> PlaceBed:
    """Return a place without its table of alpha where every stage gives alpha, so that its ends bind nothing."""
    openings = [each for visit in visited for each in visit.stage.opening if each.name == place.opening]
    given = [each.alpha_sea if place.side == "sea" else each.alpha_basin for each in openings]
    idle = place.alpha_lengths_m and all(alpha is not None for alpha in given)
    return place.model_copy(update={"alpha_lengths_m": (), "alpha_values": ()}) if idle else place


def surface_beds(cases: tuple[PlaceCase, ...]) -> dict[tuple[str, Side], tuple[BedHistory, ...]]:
    """Return what the bed feels at every place; what is refused at any of them is told at once.

    Raises
    ------
    DomainError
        With every refusal.
    """
    rows: dict[tuple[str, Side], tuple[BedHistory, ...]] = {}
    refused = []
    for case in cases:
        beds = []
        for visit in case.visits:
            try:
                beds.append(_bed(case, visit, case.layers.layers[0], None))
            except DomainError as error:
                refused.append(str(error))
        rows[case.place.opening, case.place.side] = tuple(beds)
    if refused:
        raise DomainError("\n".join(refused))
    return rows


def rows_at(
    case: PlaceCase,
    length_m: float | None = None,
    change: Change = UNCHANGED,
    rules: tuple[Rule, ...] = RULES,
    reference_m_s: float | None = None,
) -> tuple[RowDurations, ...]:
    """Return the rows of a place for a length of its protection, None for the plan's own, and changed inputs.

    Only the hours of `rules` are computed. In layers of the bed where a given reference does not serve, the row has
    its own.
    """
    return tuple(
        RowDurations(
            layers=tuple(
                _duration(case, visit, layer, length_m, change, rules, reference_m_s) for layer in case.layers.layers
            ),
            top_depth_m=case.layers.top_depth_m,
        )
        for visit in case.visits
    )


def _duration(
    case: PlaceCase,
    visit: Visit,
    layer: BedLayer | None,
    length_m: float | None,
    change: Change,
    rules: tuple[Rule, ...],
    reference_m_s: float | None,
) -> EffectiveDuration:
    bed = _changed(_bed(case, visit, layer, length_m), change)
    if reference_m_s is not None and len(case.layers.layers) > 1:
        # What is refused in a layer that no hole is in when the stage starts is no fault of the plan: `place_result`.
        try:
            return effective_duration(bed, visit.cycles, case.law, reference_m_s, rules).scaled(change.hours)
        except DomainError:
            reference_m_s = None
    return effective_duration(bed, visit.cycles, case.law, reference_m_s, rules).scaled(change.hours)


def place_result(case: PlaceCase, beds: tuple[BedHistory, ...]) -> PlaceResult:
    """Return growth, comparison of rules and required length of one place; `beds` are those of its surface."""
    plan, place, law = case.plan, case.place, case.law
    driving = plan.scour.tide
    rows = rows_at(case, reference_m_s=plan.scour.reference_velocity_m_s)
    chains = {rule: chained(place, rows, law, rule) for rule in RULES}
    _refuse_reference(case, rows, chains[driving])
    growth = growth_curve(rows, law, place.start_depth_m, driving, place.growth_factor)
    main = main_row(rows, chains[driving])
    required = place_length(case, main)
    return PlaceResult(
        place=place,
        layers=case.layers,
        rows=tuple(
            DurationRow(
                stage=visit.stage,
                bed=bed,
                durations=row,
                duration=row.layers[chains[driving][number].layer],
                chain=tuple(chains[rule][number] for rule in RULES),
                equal_alpha=_equal_alphas(case, visit, row, chains[driving][number].layer),
                peak_gap_velocity_m_s=peak_gap_velocity(visit, place.side),
            )
            for number, (visit, bed, row) in enumerate(zip(case.visits, beds, rows, strict=True))
        ),
        growth_time_s=growth.time_s,
        growth_depth_m=growth.depth_m,
        growth_stage=growth.stage,
        required=required,
        length_reached_s=time_reached(growth, allowed_depth(place)),
        length_curve=None
        if main is None
        else length_curve(
            place,
            _lengths(place, required.length_m, required.minimum_m),
            lambda length_m: rows_at(case, length_m, rules=(driving,)),
            law,
            driving,
            main,
        ),
    )


def _refuse_reference(case: PlaceCase, rows: tuple[RowDurations, ...], steps: tuple[ChainStep, ...]) -> None:
    """Refuse a given reference that does not serve in the layer where a hole lies when a stage starts."""
    reference_m_s = case.plan.scour.reference_velocity_m_s
    for visit, row, step in zip(case.visits, rows, steps, strict=True):
        felt = row.layers[step.layer]
        if reference_m_s is not None and felt.peak_velocity_m_s > 0.0 and felt.reference_velocity_m_s != reference_m_s:
            bed = _bed(case, visit, case.layers.layers[step.layer], None)
            effective_duration(bed, visit.cycles, case.law, reference_m_s)


def place_length(case: PlaceCase, main: EffectiveDuration | None) -> RequiredLength:
    """Return the required length of one place; `main` is the row with the largest share in its growth."""
    place = case.place
    slope = place.upstream_slope_cot if place.upstream_slope_cot is not None else _upstream_slope(case, main)
    return required_length(
        place,
        minimum_length([visit.flow for visit in case.visits], place),
        lambda length_m: rows_at(case, length_m, rules=(case.plan.scour.tide,)),
        case.law,
        case.plan.scour.tide,
        slope,
    )


def _equal_alphas(case: PlaceCase, visit: Visit, row: RowDurations, layer: int) -> tuple[float, ...]:
    bed = _bed(case, visit, case.layers.layers[layer], None)
    return equal_alphas(bed, visit.cycles, case.law, row.layers[layer].alpha)


def _bed(case: PlaceCase, visit: Visit, layer: BedLayer | None, length_m: float | None) -> BedHistory:
    plan = case.plan
    return bed_history(visit.stage, visit.flow, visit.opening, case.place, plan.bed, plan.water, length_m, layer)


def _changed(bed: BedHistory, change: Change) -> BedHistory:
    if change == UNCHANGED:
        return bed
    return replace(
        bed,
        signed_velocity_m_s=bed.signed_velocity_m_s * change.velocity,
        alpha=bed.alpha * change.alpha,
        alpha_ref=bed.alpha_ref * change.alpha,
        critical_velocity_m_s=bed.critical_velocity_m_s * change.critical_velocity,
    )


def _lengths(place: PlaceBed, required_m: float, minimum_m: float) -> np.ndarray:
    """Return lengths around the given and the required one, none under the least."""
    longest = 1.5 * max(place.length_m, required_m)
    return np.linspace(minimum_m, max(longest, minimum_m + 1.0), 9)


def _upstream_slope(case: PlaceCase, main: EffectiveDuration | None) -> float:
    """Return the slope of the growing hole at the worst row's reference, NaN where the formula has none."""
    grain_mm = None if main is None else grain_size_mm(case.place, case.plan.bed, case.layers.layers[0])
    if main is None or grain_mm is None:
        return float("nan")
    water = case.plan.water
    density = submerged_relative_density(water.temperature_c, water.salinity_g_kg, case.plan.bed.grain_density_kg_m3)
    velocity, turbulence = np.array([main.reference_velocity_m_s]), np.array([main.turbulence])
    return float(upstream_slope_cot(velocity, turbulence, grain_mm / 1000.0, density, case.place.chezy_m05_s)[0])


def peak_gap_velocity(visit: Visit, side: Side) -> float:
    """Return the highest velocity in the gap towards a side [m/s]; NaN where the end velocity is given."""
    if visit.opening.given_end_velocity_m_s is not None:
        return float("nan")
    towards = visit.opening.gap_velocity_m_s if side == "basin" else -visit.opening.gap_velocity_m_s
    return float(np.max(towards[visit.flow.covered], initial=0.0))
