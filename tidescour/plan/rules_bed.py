"""Rules of a plan that need more than one key: the bed, its protection, the growth of holes, and filters."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import pairwise
from typing import Final

from tidescour.plan.draft import Draft
from tidescour.plan.models_bed import (
    LAWS_WITH_TIME_SCALE,
    MODEL_CURVE,
    MOST_FINES_OF_SAND,
    SATURATING,
    Bed,
    BedLayer,
    Grading,
    PlaceOverride,
    Scour,
)
from tidescour.plan.problems import KeyPath, Problem, found, key_text, listed, purposes_of
from tidescour.plan.rules_names import same_names
from tidescour.plan.rules_places import DraftPlace, draft_places

_OF_A_SOIL: Final = ("fines_percent", "critical_velocity_m_s", "critical_velocity_evidence")
_SIZES: Final = ("d10_mm", "d15_mm", "d60_mm", "d85_mm")
_FIXED_RATE: Final = "fixed-rate"


def alpha_has_one_source(draft: Draft) -> Iterator[Problem]:
    """Refuse alpha beside its table, half of a table, lists of two lengths, and a table that runs the wrong way."""
    for path, _ in draft.each_with(PlaceOverride):
        has_lengths, has_values = draft.has(*path, "alpha_lengths_m"), draft.has(*path, "alpha_values")
        if draft.has(*path, "alpha") and (has_lengths or has_values):
            message = "stands beside a table of alpha by length; leave out one of the two"
            yield Problem(path=(*path, "alpha"), message=message)
        if has_lengths != has_values:
            missing, given = ("alpha_values", "alpha_lengths_m")[:: 1 if has_lengths else -1]
            yield Problem(path=(*path, missing), message=f"missing; {given} needs it: {_meaning(missing)}")
    for path, place in draft.each_with(PlaceOverride, "alpha_lengths_m", "alpha_values"):
        lengths, values = place.alpha_lengths_m or (), place.alpha_values or ()
        if lengths and values and len(lengths) != len(values):
            message = f"has {len(values)} values where alpha_lengths_m has {len(lengths)}"
            yield Problem(path=(*path, "alpha_values"), message=message)
        for position, (before, after) in enumerate(pairwise(lengths), start=1):
            if after <= before:
                message = f"found {after:g} after {before:g}; lengths must increase"
                yield Problem(path=(*path, "alpha_lengths_m", position), message=message)
        for position, (before, after) in enumerate(pairwise(values), start=1):
            if after > before:
                message = f"found {after:g} after {before:g}; alpha cannot rise with the length of the protection"
                yield Problem(path=(*path, "alpha_values", position), message=message)


def _meaning(key: str) -> str:
    return PlaceOverride.model_fields[key].description or ""


def spreading_has_its_rate(draft: Draft) -> Iterator[Problem]:
    """Refuse, at any place, spreading at a fixed rate without one, and a rate beside another spreading."""
    places = draft_places(draft, "spreading", "widening")
    yield from dict.fromkeys(problem for place in places for problem in _spreading_problems(draft, place))


def _spreading_problems(draft: Draft, place: DraftPlace) -> Iterator[Problem]:
    at, spreading = place.given(draft, "spreading")
    rate_at, rate = place.given(draft, "widening")
    if spreading is None or spreading not in draft.choices.spreadings:
        return
    if spreading != _FIXED_RATE and rate:
        if rate_at == at or len(rate_at) > len(at):
            remedy = f'leave it out, or write spreading = "{_FIXED_RATE}"'
            message = f"found {rate:g}, but spreading = {found(spreading)} takes no rate; {remedy}"
            yield Problem(path=(*rate_at, "widening"), message=message)
        else:
            message = f"found {found(spreading)}, but widening = {rate:g} of [{key_text(rate_at, {})}] holds here too"
            yield Problem(path=(*at, "spreading"), message=f"{message}; write widening = 0 here")
    if spreading == _FIXED_RATE and rate is None:
        message = f'missing; spreading = "{_FIXED_RATE}" needs it: {_meaning("widening")}'
        yield Problem(path=(*at, "widening"), message=message)
    if spreading == _FIXED_RATE and rate == 0.0:
        message = f'found 0, but spreading = "{_FIXED_RATE}" needs a number over 0; or write spreading = "none"'
        yield Problem(path=(*rate_at, "widening"), message=message)


def stop_slopes_have_a_height(draft: Draft) -> Iterator[Problem]:
    """Refuse, at any place, a slope that stops the works without the height over which it is taken, and that alone."""
    keys = ("stop_slope_cot", "stop_slope_height_m")
    problems = {}
    for place in draft_places(draft, *keys):
        for key, other in (keys, keys[::-1]):
            path, value = place.given(draft, key)
            if value is not None and not place.given(draft, other)[0]:
                message = f"missing; {key} and {other} go together: {_meaning(other)}"
                problems[*path, other] = Problem(path=(*path, other), message=message)
    yield from problems.values()


def layers_lie_under_each_other(draft: Draft) -> Iterator[Problem]:
    """Refuse layers of one name, out of order from the top down, or without grain size and critical velocity."""
    yield from same_names(((path, part.name) for path, part in draft.each_with(BedLayer, "name")), "layer")
    for (_, upper), (path, lower) in pairwise(draft.each_with(BedLayer, "top_level_m")):
        if lower.top_level_m >= upper.top_level_m:
            message = f"found {lower.top_level_m:g}, not under {upper.top_level_m:g} of the layer above it"
            yield Problem(path=(*path, "top_level_m"), message=f"{message}; write layers from the top down")
    for path, _ in draft.each_with(BedLayer):
        if not draft.has(*path, "d50_mm") and not draft.has(*path, "critical_velocity_m_s"):
            message = "missing; the critical velocity needs it, unless critical_velocity_m_s is given"
            yield Problem(path=(*path, "d50_mm"), message=message, only_for=purposes_of(path))


def cohesion_has_its_evidence(draft: Draft) -> Iterator[Problem]:
    """Refuse a critical velocity of a soil with fines that no erosion tests stand behind."""
    soils: list[tuple[KeyPath, Bed | BedLayer]] = [
        *draft.each_with(Bed, *_OF_A_SOIL),
        *draft.each_with(BedLayer, *_OF_A_SOIL),
    ]
    for path, soil in soils:
        given, evidence = soil.critical_velocity_m_s, soil.critical_velocity_evidence
        if evidence is not None and given is None:
            message = "belongs to critical_velocity_m_s, and none is given; leave it out"
            yield Problem(path=(*path, "critical_velocity_evidence"), message=message)
        if given is not None and evidence is None and (soil.fines_percent or 0.0) > MOST_FINES_OF_SAND:
            message = (
                f"found {given:g} for a soil with {soil.fines_percent:g} % of fines, whose cohesion is not credited "
                f"without erosion tests: over {MOST_FINES_OF_SAND:g} % the threshold can be 2 to 4 times that of sand, "
                "but it falls once the top layer fails; write critical_velocity_evidence, or leave "
                "critical_velocity_m_s out so that d50_mm gives the threshold of clean sand"
            )
            yield Problem(path=(*path, "critical_velocity_m_s"), message=message)


def growth_laws_have_their_numbers(draft: Draft) -> Iterator[Problem]:
    """Refuse numbers of another growth law, and a curve without its law, its source, or the other way round."""
    laws_of = {
        "time_constant": LAWS_WITH_TIME_SCALE,
        "time_exponent": LAWS_WITH_TIME_SCALE,
        "equilibrium": (SATURATING,),
        "curve_file": (MODEL_CURVE,),
        "curve_source": (MODEL_CURVE,),
    }
    for path, scour in draft.each_with(Scour, "law"):
        if scour.law not in draft.choices.laws:
            continue
        for key, laws in laws_of.items():
            if draft.has(*path, key) and scour.law not in laws:
                message = f"means nothing to law = {found(scour.law)}; leave it out, or write law = {listed(laws)}"
                yield Problem(path=(*path, key), message=message)
        for key in ("curve_file", "curve_source"):
            if scour.law == MODEL_CURVE and not draft.has(*path, key):
                message = f'missing; law = "{MODEL_CURVE}" needs it: {Scour.model_fields[key].description}'
                yield Problem(path=(*path, key), message=message, only_for=purposes_of(path))


def filters_are_graded(draft: Draft) -> Iterator[Problem]:
    """Refuse a filter of one grading, gradings of one name, and grain sizes that run backwards."""
    yield from same_names(((path, part.name) for path, part in draft.each_with(Grading, "name")), "grading")
    gradings = list(draft.each_with(Grading))
    if len(gradings) == 1:
        message = "there is one grading; a filter needs the one under it too: write [[filter]] for the bed first"
        yield Problem(path=("filter",), message=message, only_for=purposes_of(("filter",)))
    for path, grading in gradings:
        sizes = [(key, size) for key in _SIZES if draft.is_sound(path, key) and (size := getattr(grading, key))]
        for (finer, below), (coarser, above) in pairwise(sizes):
            if above < below:
                yield Problem(path=(*path, coarser), message=f"found {above:g}, below {finer} = {below:g}")
