"""Flow through a dam of stones, as a scalar kernel with the signature of `tidescour.gap.crests`."""

from __future__ import annotations

import math

from tidescour.compiled import compiled, compiled_relation
from tidescour.gap.crests import WET_M, mean_width, signed
from tidescour.gap.layers import LEVEL, layer_of
from tidescour.gap.section import crest_area
from tidescour.units import GRAVITY_M_S2, FloatArray

_MOST_ITERATIONS = 60

# Five points of Gauss and Legendre on [0, 1]: exact for the turbulent part in a rectangle.
_NODES = (
    0.5 - 0.5 * 0.9061798459386640,
    0.5 - 0.5 * 0.5384693101056831,
    0.5,
    0.5 + 0.5 * 0.5384693101056831,
    0.5 + 0.5 * 0.9061798459386640,
)
_WEIGHTS = (
    0.5 * 0.2369268850561891,
    0.5 * 0.4786286704993665,
    0.5 * 0.5688888888888889,
    0.5 * 0.4786286704993665,
    0.5 * 0.2369268850561891,
)


@compiled
def forchheimer(
    porosity: float, stone_m: float, viscosity_m2_s: float, laminar: float, turbulent: float
) -> tuple[float, float]:
    """Return a [s/m] and b [s2/m2] of the gradient i = a u + b u^2, u the filter velocity.

    a = alpha (1 - n)^2 / n^3 nu / (g d^2), b = beta (1 - n) / n^3 / (g d).

    References
    ----------
    Forchheimer's form; alpha 150, beta 1.75: Ergun (1952); 1000 and 1.1 with d = Dn50: van Gent (1995), from memory.
    """
    tortuous = (1.0 - porosity) / porosity**3
    return (
        laminar * (1.0 - porosity) * tortuous * viscosity_m2_s / (GRAVITY_M_S2 * stone_m**2),
        turbulent * tortuous / (GRAVITY_M_S2 * stone_m),
    )


@compiled
def _body(
    discharge: float, low_m: float, high_m: float, roof_m: float, crest_m: float, layers: FloatArray, a: float, b: float
) -> tuple[float, float]:
    """Return the integral of A^2 / (a A + b Q) from level to level [m], and how fast it falls with the discharge.

    Layer by layer, for inside one the area is smooth.
    """
    length, slope = 0.0, 0.0
    start = low_m
    k = layer_of(low_m, LEVEL, layers)
    while start < high_m:
        k += 1
        end = min(high_m, layers[k, LEVEL]) if k < layers.shape[0] else high_m
        if start < roof_m < end:
            end = roof_m
            k -= 1
        for j in range(5):
            area = crest_area(min(start + _NODES[j] * (end - start), roof_m), crest_m, layers)
            resistance = a * area + b * discharge
            share = _WEIGHTS[j] * (end - start) * area * area / resistance
            length += share
            slope -= share * b / resistance
        start = end
    return length, slope


@compiled_relation
def rubble_dam(
    sea_m: float, basin_m: float, crest_m: float, layers: FloatArray, numbers: FloatArray
) -> tuple[float, float, float]:
    """Flow through a dam of stones whose faces stand upright, water table by Dupuit, resistance by Forchheimer.

    The crest is the dam's foot. With area A by level: Q L = integral of A^2 / (a A + b Q) dz from the downstream to
    the upstream level; without the laminar part and for a rectangle q = sqrt((h1^3 - h2^3) / (3 b L)). Above its top
    the dam ends; what overtops it is an opening of its own. The velocity is that of the filter, between the faces.

    References
    ----------
    Dupuit's assumption with Forchheimer's law; derived. No seepage face.
    """
    upstream, downstream = max(sea_m, basin_m), max(min(sea_m, basin_m), crest_m)
    if upstream <= downstream + WET_M:
        area = crest_area(min(upstream, crest_m + numbers[6]), crest_m, layers)
        return 0.0, area, mean_width(area, min(upstream, crest_m + numbers[6]) - crest_m)
    a, b = forchheimer(numbers[0], numbers[1], numbers[5], numbers[3], numbers[4])
    length, roof = numbers[2], crest_m + numbers[6]
    # Without the laminar part Q^2 = integral of A^2 / (b L): an upper bound, close in coarse stone.
    square, _ = _body(1.0, downstream, upstream, roof, crest_m, layers, 0.0, 1.0)
    low, high = 0.0, math.sqrt(square / (b * length))
    discharge = high
    for _ in range(_MOST_ITERATIONS):
        reach, slope = _body(discharge, downstream, upstream, roof, crest_m, layers, a, b)
        excess = reach - length * discharge
        if excess > 0.0:
            low = discharge
        else:
            high = discharge
        new = discharge - excess / (slope - length)
        if not low <= new <= high:
            new = 0.5 * (low + high)
        if abs(new - discharge) <= 1e-13 * discharge:
            break
        discharge = new
    top = min(0.5 * (upstream + downstream), roof)
    area = crest_area(top, crest_m, layers)
    return signed(discharge, sea_m, basin_m), area, mean_width(area, top - crest_m)
