"""What each input is worth in metres of depth and of length, one changed at a time."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from typing import Final

from tidescour.bed.history import place_name
from tidescour.bed.layers import bed_layers
from tidescour.bed.spreading import USUAL_WIDENING
from tidescour.errors import DomainError, Finding
from tidescour.handoff.records import PlaceResult, Sensitivity
from tidescour.pipeline.places import UNCHANGED, Change, PlaceCase, rows_at
from tidescour.plan.models_bed import Equilibrium, Scour
from tidescour.scour.chain import final_depth
from tidescour.scour.law_findings import NEAR_JUMP
from tidescour.scour.laws import LAWS, GrowthLaw
from tidescour.scour.length import chained, minimum_length, nearby_length
from tidescour.scour.records import ChainStep
from tidescour.scour.shapes import SATURATING

LEVEL_STEP_M: Final = 0.5
GRAIN_SHARE: Final = 0.8
SCATTER: Final = 1.3
DENSITY_SHARE: Final = 0.95
"""Steps of the changes: as large as what is not known about an input in an early design (judgement, no source)."""

_SPREADING_WORDS: Final = {
    "none": "no spreading of the flow",
    "fixed-rate": f"flow spreading 1 in {1.0 / USUAL_WIDENING:g} to either side",
    "plane-jet": "flow spreading as a plane jet",
}
_PUBLISHED_LAWS: Final[tuple[tuple[str, Equilibrium, str], ...]] = (
    ("explicit", "half-alpha", "growth law explicit"),
    ("time-scale", "half-alpha", "growth law time-scale"),
    ("saturating", "half-alpha", "growth law saturating, equilibrium half-alpha"),
    ("saturating", "turbulence", "growth law saturating, equilibrium turbulence"),
)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Variant:
    """One input changed: in words, the place as it is then, and what is multiplied in its rows."""

    words: str
    case: PlaceCase
    change: Change = UNCHANGED


def sensitivities(case: PlaceCase, result: PlaceResult, submerged_relative_density: float) -> tuple[Sensitivity, ...]:
    """Change one input of a place at a time, and compute depth and required length anew.

    Parameters
    ----------
    case : PlaceCase
        The place.
    result : PlaceResult
        Its result as planned.
    submerged_relative_density : float
        rho_s / rho - 1.

    Returns
    -------
    tuple of Sensitivity
        Of the rule that drives growth. The flows are those of the plan in every one: what changes them is told by the
        larger sea tide.
    """
    base_m = final_depth(_steps(case, UNCHANGED, None), case.place.start_depth_m)
    return tuple(_sensitivity(variant, result, base_m) for variant in _variants(case, submerged_relative_density))


def spreading_finding(result: PlaceResult) -> Finding:
    """Tell what another spreading of the flow over the protection would do to one place."""
    place = result.place
    fixed = f"flow spreading 1 in {1.0 / place.widening:.3g} to either side" if place.widening > 0.0 else ""
    own = fixed or _SPREADING_WORDS[place.spreading]
    others = "; ".join(
        f"{each.change}: depth {each.depth_change_m:+z.2f} m, required length {each.length_change_m:+z.1f} m"
        for each in result.sensitivities
        if each.change in _SPREADING_WORDS.values()
    )
    return Finding(
        severity="note",
        code="spreading-compared",
        where=place_name(place.opening, place.side),
        message=f"computed with {own}; the same with {others}",
    )


def _variants(case: PlaceCase, density: float) -> Iterator[_Variant]:
    place, plan = case.place, case.plan
    # A law of alpha u alone cannot tell the two apart.
    either = "" if case.law.equilibrium == "turbulence" else ", or alpha,"
    words = f"velocity at the end of the protection{either} 10 % higher"
    yield _Variant(words=words, case=case, change=Change(velocity=1.1))
    yield _Variant(words="critical velocity 10 % lower", case=case, change=Change(critical_velocity=0.9))
    yield _Variant(words="every stage 10 % longer, with the same tides", case=case, change=Change(hours=1.1))
    yield _Variant(
        words=f"growth factor {100.0 * (SCATTER - 1.0):.0f} % higher",
        case=_with_place(case, growth_factor=SCATTER * place.growth_factor),
    )
    yield _Variant(
        words="submerged relative density in the growth law 5 % lower",
        case=replace(case, law=_law(plan.scour, DENSITY_SHARE * density)),
    )
    yield from _other_laws(case, density)
    yield _Variant(
        words=f"bed at the end of the protection {LEVEL_STEP_M:g} m higher, same discharges",
        case=_with_place(case, bed_level_m=place.bed_level_m + LEVEL_STEP_M),
    )
    if finer := _with_finer_surface(case):
        yield _Variant(words=f"d50 at the surface {100.0 * (1.0 - GRAIN_SHARE):.0f} % finer", case=finer)
    if place.chezy_m05_s is not None:
        yield _Variant(
            words="Chezy coefficient of the protection 10 % lower",
            case=_with_place(case, chezy_m05_s=0.9 * place.chezy_m05_s),
        )
    yield _Variant(
        words="failure slope flatter by 1 (1 in n + 1)",
        case=_with_place(case, failure_slope_cot=place.failure_slope_cot + 1.0),
    )
    for spreading, words in _SPREADING_WORDS.items():
        if spreading != place.spreading:
            widening = USUAL_WIDENING if spreading == "fixed-rate" else 0.0
            yield _Variant(words=words, case=_with_place(case, spreading=spreading, widening=widening))


def _with_place(case: PlaceCase, **changes: object) -> PlaceCase:
    place = case.place.model_copy(update=changes)
    return replace(case, place=place, layers=bed_layers(place, case.plan.bed))


def _with_finer_surface(case: PlaceCase) -> PlaceCase | None:
    """Return the place with a finer grain at the surface; None where the threshold there is given."""
    surface, *below = case.layers.layers
    if surface is None:
        if case.place.d50_mm is None or case.plan.bed.critical_velocity_m_s is not None:
            return None
        return replace(case, place=case.place.model_copy(update={"d50_mm": GRAIN_SHARE * case.place.d50_mm}))
    if surface.d50_mm is None or surface.critical_velocity_m_s is not None:
        return None
    finer = surface.model_copy(update={"d50_mm": GRAIN_SHARE * surface.d50_mm})
    return replace(case, layers=replace(case.layers, layers=(finer, *below)))


def _law(scour: Scour, density: float) -> GrowthLaw:
    return LAWS[scour.law].function(density, scour)


def _other_laws(case: PlaceCase, density: float) -> Iterator[_Variant]:
    """Yield the published laws that the plan does not take, with the plan's own numbers where they have any."""
    own = case.plan.scour
    for name, equilibrium, words in _PUBLISHED_LAWS:
        if name != own.law or (name == "saturating" and equilibrium != own.equilibrium):
            scour = own.model_copy(update={"law": name, "equilibrium": equilibrium})
            yield _Variant(words=words, case=replace(case, law=_law(scour, density)))


def _steps(case: PlaceCase, change: Change, length_m: float | None) -> tuple[ChainStep, ...]:
    return chained(case.place, rows_at(case, length_m, change, (case.plan.scour.tide,)), case.law, case.plan.scour.tide)


def _without_result(variant: _Variant, why: str) -> Sensitivity:
    nothing = float("nan")
    return Sensitivity(change=variant.words, depth_change_m=nothing, length_change_m=nothing, why_empty=why)


def _near_jump(case: PlaceCase, result: PlaceResult) -> str:
    """Return why a saturating law that is not the plan's own would mislead at this place; nothing where it does not."""
    if case.law.shape != SATURATING or case.plan.scour.law == case.law.name:
        return ""
    half_alpha = case.law.equilibrium == "half-alpha"
    for felt in (row.duration for row in result.rows):
        equilibrium_m = felt.equilibrium_half_alpha_m if half_alpha else felt.equilibrium_turbulence_m
        if felt.growth_rate > 0.0 and equilibrium_m <= NEAR_JUMP * felt.reference_depth_m:
            return (
                f"stage {felt.stage!r}: the equilibrium depth of {equilibrium_m:.2f} m is under {NEAR_JUMP:g} times "
                "the water depth, where this law is near its jump"
            )
    return ""


def _sensitivity(variant: _Variant, result: PlaceResult, base_m: float) -> Sensitivity:
    case = variant.case
    place = case.place

    def depth(length_m: float | None) -> float:
        return final_depth(_steps(case, variant.change, length_m), place.start_depth_m)

    if near := _near_jump(case, result):
        return _without_result(variant, near)
    try:
        depth_m = depth(None)
        minimum = minimum_length([visit.flow for visit in case.visits], place)
        length_m = nearby_length(
            lambda length: place.depth_margin_factor * depth(length),
            place.failure_slope_cot,
            minimum,
            result.required.length_m,
        )
    except DomainError as error:
        return _without_result(variant, str(error))
    return Sensitivity(
        change=variant.words,
        depth_change_m=round(depth_m - base_m, 9),
        length_change_m=round(length_m - result.required.length_m, 9),
    )
