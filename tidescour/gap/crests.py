"""Flow over crests and through open gaps, as scalar kernels for the table of relations.

Every kernel takes the sea and the basin level [m above datum], the section (crest level and layers) and the entry's
own numbers in their order; it returns the discharge [m3/s, positive from sea to basin], and area [m2] and mean width
[m] of the control section.
"""

from __future__ import annotations

import math

from tidescour.compiled import compiled, compiled_relation
from tidescour.gap.layers import LEVEL, layer_of
from tidescour.gap.section import control_level, crest_area, energy_discharge
from tidescour.units import GRAVITY_M_S2, FloatArray

_MOST_ITERATIONS = 60
_HALVINGS = 50
_MOST_OF_APPROACH = 1.0 - 1e-6
_JUST_OVER = 1.0 + 1e-12

LARGEST_GAP = 0.8
"""Area of an open gap over that of its channel from which so much head is won back that the rest tells nothing:
judgement, no source."""

WET_M = 1e-9
"""Less water over a crest than this is rounding, and it is dry."""


@compiled
def signed(discharge: float, sea_m: float, basin_m: float) -> float:
    """Return a discharge with the sign of the head; nothing has none."""
    return discharge if sea_m >= basin_m or discharge == 0.0 else -discharge


@compiled
def mean_width(area_m2: float, depth_m: float) -> float:
    """Return area over depth [m]; NaN where dry."""
    return area_m2 / depth_m if depth_m > 0.0 and area_m2 > 0.0 else math.nan


@compiled
def _level_of_discharge(
    discharge: float, coefficient: float, energy_m: float, critical_m: float, crest_m: float, layers: FloatArray
) -> float:
    """Return the level from critical upwards at which the energy lets just that discharge pass."""
    low, high = critical_m, energy_m
    for _ in range(_HALVINGS):
        middle = 0.5 * (low + high)
        if coefficient * energy_discharge(energy_m, middle, crest_area(middle, crest_m, layers)) > discharge:
            low = middle
        else:
            high = middle
    return 0.5 * (low + high)


@compiled
def crest_flow(
    upstream_m: float,
    downstream_m: float,
    crest_m: float,
    layers: FloatArray,
    coefficient: float,
    modular_limit: float,
    approach_width_m: float,
    approach_bed_m: float,
) -> tuple[float, float, float]:
    """Return discharge [m3/s], area [m2] and level [m above datum] of the control section of a wet broad crest.

    The energy is that of the approach: E = h + (Q / A1)^2 / 2g. For a control section given, E follows in closed
    form; the section follows from E; repeated from the upstream level this is Newton's method on a convex function
    from its left, which climbs to the lower root: the one with a tranquil approach.

    NaN where the tailwater drowns a crest that leads more than its approach at the same level: nothing but losses
    that are not in the equation would hold the flow then, however small the head.
    """
    approach_depth = upstream_m - approach_bed_m
    approach_area = approach_width_m * approach_depth
    energy = upstream_m
    for _ in range(_MOST_ITERATIONS):
        frees = math.inf
        level = control_level(energy, downstream_m, crest_m, layers)
        passing = coefficient
        if modular_limit > 0.0:
            critical = control_level(energy, crest_m, crest_m, layers)
            limit = crest_m + modular_limit * (energy - crest_m)
            free = energy_discharge(energy, critical, crest_area(critical, crest_m, layers))
            if limit > critical and free > 0.0:
                level = critical
                if downstream_m > limit:
                    level = downstream_m
                    # The energy from which the limit leaves the crest free, and the function is another.
                    frees = crest_m + (downstream_m - crest_m) / modular_limit * _JUST_OVER
                    passing = coefficient * free / energy_discharge(energy, limit, crest_area(limit, crest_m, layers))
        area = crest_area(level, crest_m, layers)
        most = passing * crest_area(upstream_m, crest_m, layers)
        if crest_m < level == downstream_m and most >= _MOST_OF_APPROACH * approach_area:
            return math.nan if downstream_m < upstream_m else 0.0, area, level
        share = (passing * area / approach_area) ** 2
        highest = upstream_m + 0.5 * approach_depth
        new = min((upstream_m - share * level) / (1.0 - share) if share < 1.0 else math.inf, frees)
        if new >= highest:
            # The approach itself is critical: no more can come.
            return approach_area * math.sqrt(GRAVITY_M_S2 * approach_depth), area, level
        if abs(new - energy) <= 1e-13 * (energy - crest_m):
            break
        energy = new
    discharge = passing * energy_discharge(energy, level, area)
    if passing != coefficient:
        critical = control_level(energy, crest_m, crest_m, layers)
        level = _level_of_discharge(discharge, coefficient, energy, critical, crest_m, layers)
        area = crest_area(level, crest_m, layers)
    return discharge, area, level


@compiled_relation
def broad_crest(
    sea_m: float, basin_m: float, crest_m: float, layers: FloatArray, numbers: FloatArray
) -> tuple[float, float, float]:
    """Flow over a broad crest, free or drowned.

    Q = m A(z) sqrt(2 g (E - z)), z the level in the control section. Free flow is the maximum of that expression, so
    that the discharge and its slope are continuous where the crest drowns and no blending is needed. With a modular
    limit S the flow stays free until the tailwater reaches S of the energy over the crest; from there the coefficient
    is that which keeps the discharge continuous, 0.3849 m / (S sqrt(1 - S)) for a rectangle.

    References
    ----------
    Encyclopaedia Britannica, 11th ed. (1910), Hydraulics, section 44: discharge at the depth that makes it largest.
    """
    flood = sea_m >= basin_m
    upstream, downstream = max(sea_m, basin_m), min(sea_m, basin_m)
    if upstream <= crest_m + WET_M:
        return 0.0, 0.0, math.nan
    if numbers[1] == 0.0 and math.isinf(numbers[2] if flood else numbers[4]):
        level = control_level(upstream, downstream, crest_m, layers)
        area = crest_area(level, crest_m, layers)
        discharge = numbers[0] * energy_discharge(upstream, level, area)
        return signed(discharge, sea_m, basin_m), area, mean_width(area, level - crest_m)
    discharge, area, level = crest_flow(
        upstream,
        downstream,
        crest_m,
        layers,
        numbers[0],
        numbers[1],
        numbers[2] if flood else numbers[4],
        numbers[3] if flood else numbers[5],
    )
    return signed(discharge, sea_m, basin_m), area, mean_width(area, level - crest_m)


@compiled_relation
def narrow_crest(
    sea_m: float, basin_m: float, crest_m: float, layers: FloatArray, numbers: FloatArray
) -> tuple[float, float, float]:
    """Flow over a narrow or sharp crest, drowned after Villemonte.

    Q = Q_free (1 - (h2 / h1)^n)^0.385. The exponent n is that of the free law at this head, E / (2 (E - y_c)): 1.5 for
    a rectangle, 2.5 for a triangle, between for others.

    References
    ----------
    Villemonte (1947), Submerged-weir discharge studies, Engineering News-Record 139; the exponent of other sections
    from d ln Q / d ln E at the critical depth.
    """
    upstream, downstream = max(sea_m, basin_m), min(sea_m, basin_m)
    if upstream <= crest_m + WET_M:
        return 0.0, 0.0, math.nan
    critical = control_level(upstream, crest_m, crest_m, layers)
    discharge = numbers[0] * energy_discharge(upstream, critical, crest_area(critical, crest_m, layers))
    if downstream > crest_m:
        exponent = 0.5 * (upstream - crest_m) / (upstream - critical)
        ratio = (downstream - crest_m) / (upstream - crest_m)
        discharge *= (1.0 - ratio**exponent) ** 0.385
    level = max(downstream, critical)
    area = crest_area(level, crest_m, layers)
    return signed(discharge, sea_m, basin_m), area, mean_width(area, level - crest_m)


@compiled
def _loss(area: float, contraction: float, upstream_area: float, downstream_area: float, friction: float) -> float:
    """Return head loss over velocity head per square of discharge [1/m4] of an open gap."""
    spread = 1.0 / downstream_area
    return (1.0 / (contraction * area) - spread) ** 2 + spread**2 - 1.0 / upstream_area**2 + friction / area**2


@compiled
def _passing(
    level: float,
    upstream: float,
    crest_m: float,
    layers: FloatArray,
    contraction: float,
    upstream_area: float,
    downstream_area: float,
    friction: float,
) -> float:
    """Return the square of the discharge of an open gap with a level in it; NaN where the formula has none."""
    area = crest_area(level, crest_m, layers)
    if area <= 0.0:
        return 0.0
    if area > LARGEST_GAP * min(upstream_area, downstream_area):
        return math.nan
    loss = _loss(area, contraction, upstream_area, downstream_area, friction)
    return 2.0 * GRAVITY_M_S2 * (upstream - level) / loss if loss > 0.0 else math.nan


@compiled
def _passes_most(
    low: float,
    upstream: float,
    crest_m: float,
    layers: FloatArray,
    contraction: float,
    upstream_area: float,
    downstream_area: float,
    friction: float,
) -> float:
    """Return the level in an open gap, from a lowest one upwards, at which most passes.

    Layer by layer, halving where the discharge still rises at a layer's start and falls at its end.
    """
    best_level = low
    best = _passing(low, upstream, crest_m, layers, contraction, upstream_area, downstream_area, friction)
    nudge = 1e-7 * (upstream - crest_m)
    for k in range(layer_of(low, LEVEL, layers), layers.shape[0]):
        start = max(low, layers[k, LEVEL])
        if start >= upstream:
            break
        end = min(upstream, layers[k + 1, LEVEL]) if k + 1 < layers.shape[0] else upstream
        for turn in range(_HALVINGS):
            middle = start if turn == 0 else 0.5 * (start + end)
            here = _passing(middle, upstream, crest_m, layers, contraction, upstream_area, downstream_area, friction)
            above = _passing(
                middle + nudge, upstream, crest_m, layers, contraction, upstream_area, downstream_area, friction
            )
            if here > best:
                best, best_level = here, middle
            if above > here:
                start = middle
            elif turn == 0:
                break
            else:
                end = middle
    return best_level


@compiled_relation
def open_gap(
    sea_m: float, basin_m: float, crest_m: float, layers: FloatArray, numbers: FloatArray
) -> tuple[float, float, float]:
    """Flow through an open gap: contraction, then sudden expansion with pressure recovery.

    Q = sqrt(2 g dz / [(1/(mu A) - 1/A2)^2 + 1/A2^2 - 1/A1^2 + f/A^2]), A at the downstream level, A1 and A2 the
    channel upstream and downstream, where the gauges stand. Where the tailwater is so low that a higher level in the
    gap would let more pass, the gap is the control and takes that level. NaN where the gap is over 0.8 of a channel.

    References
    ----------
    Energy to the vena contracta, momentum in the expansion (Borda-Carnot), as in any hydraulics text; derived.
    """
    upstream, downstream = max(sea_m, basin_m), max(min(sea_m, basin_m), crest_m)
    if upstream <= crest_m + WET_M:
        return 0.0, 0.0, math.nan
    contraction, friction = numbers[0], numbers[1]
    up_area = numbers[2] if sea_m >= basin_m else numbers[3]
    down_area = numbers[3] if sea_m >= basin_m else numbers[2]
    level = _passes_most(downstream, upstream, crest_m, layers, contraction, up_area, down_area, friction)
    square = _passing(level, upstream, crest_m, layers, contraction, up_area, down_area, friction)
    area = crest_area(level, crest_m, layers)
    return signed(math.sqrt(square), sea_m, basin_m), area, mean_width(area, level - crest_m)
