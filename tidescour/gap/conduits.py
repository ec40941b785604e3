"""Flow through openings with a roof: orifices, culverts and flaps, as scalar kernels for the table of relations.

The kernels have the signature of `tidescour.gap.crests`.
"""

from __future__ import annotations

import math

from tidescour.compiled import compiled, compiled_relation
from tidescour.gap.crests import WET_M, mean_width, signed
from tidescour.gap.layers import extent_at
from tidescour.gap.section import control_level, crest_area, energy_discharge
from tidescour.units import GRAVITY_M_S2, FloatArray


@compiled
def roofed_flow(
    upstream_m: float, downstream_m: float, crest_m: float, layers: FloatArray, roof_m: float
) -> tuple[float, float, float]:
    """Return discharge [m3/s, coefficient 1], area [m2] and level [m] of a stream that reaches no higher than a roof.

    Below the roof it is a broad crest; a stream that the roof presses down leaves at the roof, free, or against the
    tailwater where that is higher.
    """
    if upstream_m <= crest_m + WET_M:
        return 0.0, 0.0, crest_m
    level = min(control_level(upstream_m, crest_m, crest_m, layers), roof_m)
    tailwater = max(downstream_m, level)
    top = min(tailwater, roof_m)
    area = crest_area(top, crest_m, layers)
    return energy_discharge(upstream_m, tailwater, area), area, top


@compiled
def lintel_flow(
    upstream_m: float, downstream_m: float, crest_m: float, layers: FloatArray, height_m: float, contraction: float
) -> tuple[float, float, float]:
    """Return discharge [m3/s, coefficient 1], area [m2] and level [m] of a stream under a lintel.

    Water that does not touch the lintel is not contracted. From there on it passes what the contracted jet does, but
    no less than when it touched (common practice, no source).
    """
    lintel = crest_m + height_m
    if upstream_m <= lintel:
        return roofed_flow(upstream_m, downstream_m, crest_m, layers, lintel)
    jet = roofed_flow(upstream_m, downstream_m, crest_m, layers, crest_m + contraction * height_m)
    touching = roofed_flow(lintel, min(downstream_m, lintel), crest_m, layers, lintel)
    return jet if jet[0] >= touching[0] else touching


@compiled_relation
def orifice(
    sea_m: float, basin_m: float, crest_m: float, layers: FloatArray, numbers: FloatArray
) -> tuple[float, float, float]:
    """Flow under a gate or lintel, with a free surface, free jet or drowned.

    The jet is contracted to a share of the opening's height. Until the water touches the gate it is a broad crest.

    References
    ----------
    Energy from the upstream level to the vena contracta, as in any hydraulics text (Chow 1959, Open-Channel
    Hydraulics, ch. 17, from memory); contraction of a sharp horizontal edge 0.61.
    """
    discharge, area, top = lintel_flow(
        max(sea_m, basin_m), min(sea_m, basin_m), crest_m, layers, numbers[0], numbers[2]
    )
    return signed(numbers[1] * discharge, sea_m, basin_m), area, mean_width(area, top - crest_m)


@compiled
def _barrel_share(upstream_m: float, crest_m: float, layers: FloatArray, numbers: FloatArray) -> float:
    """Return the coefficient that entrance, friction and exit leave: (1 + ke + 2 g n^2 L / R^(4/3))^-1/2."""
    wet = min(upstream_m, crest_m + numbers[0])
    area = crest_area(wet, crest_m, layers)
    surface = extent_at(wet, layers)
    perimeter = surface + 2.0 * numbers[6] * (wet - crest_m)
    if upstream_m > wet:
        perimeter += surface
    friction = 2.0 * GRAVITY_M_S2 * numbers[3] ** 2 * numbers[2] / (area / perimeter) ** (4.0 / 3.0)
    return 1.0 / math.sqrt(1.0 + numbers[4] + friction)


@compiled_relation
def culvert(
    sea_m: float, basin_m: float, crest_m: float, layers: FloatArray, numbers: FloatArray
) -> tuple[float, float, float]:
    """Flow through a culvert: the less of what its entrance and what its barrel lets pass.

    The entrance is an orifice; the barrel loses entrance, friction and exit heads. Friction is taken with the
    hydraulic radius of the barrel wet up to the upstream level, roof included where it runs full.

    References
    ----------
    Full barrel: head = (1 + ke + 2 g n^2 L / R^(4/3)) V^2 / 2g, Federal Highway Administration (2012), Hydraulic
    design of highway culverts, HDS-5, 3rd ed., ch. 3 (from memory).
    """
    upstream, downstream = max(sea_m, basin_m), min(sea_m, basin_m)
    if upstream <= crest_m + WET_M:
        return 0.0, 0.0, math.nan
    lintel = crest_m + numbers[0]
    barrel, area, top = roofed_flow(upstream, downstream, crest_m, layers, lintel)
    barrel *= _barrel_share(upstream, crest_m, layers, numbers)
    if upstream > lintel:
        # The roof's friction comes all at once: no less passes than before it was wet.
        before, before_area, before_top = roofed_flow(lintel, min(downstream, lintel), crest_m, layers, lintel)
        before *= _barrel_share(lintel, crest_m, layers, numbers)
        if before > barrel:
            barrel, area, top = before, before_area, before_top
    entrance, jet_area, jet_top = lintel_flow(upstream, downstream, crest_m, layers, numbers[0], numbers[5])
    if entrance < barrel:
        barrel, area, top = entrance, jet_area, jet_top
    return signed(numbers[1] * barrel, sea_m, basin_m), area, mean_width(area, top - crest_m)


@compiled
def _flap(
    upstream_m: float, downstream_m: float, opens: bool, crest_m: float, layers: FloatArray, numbers: FloatArray
) -> tuple[float, float, float]:
    tailwater = downstream_m
    if opens and upstream_m > crest_m + WET_M:
        tailwater = min(max(downstream_m, crest_m) + numbers[3], upstream_m)
    discharge, area, top = lintel_flow(upstream_m, tailwater, crest_m, layers, numbers[0], numbers[4])
    share = numbers[1] if opens else numbers[1] * numbers[2]
    return share * discharge, area, top


@compiled_relation
def ebb_flap(
    sea_m: float, basin_m: float, crest_m: float, layers: FloatArray, numbers: FloatArray
) -> tuple[float, float, float]:
    """Flow through an opening whose flap lets the ebb out and shuts against the flood."""
    discharge, area, top = _flap(max(sea_m, basin_m), min(sea_m, basin_m), basin_m > sea_m, crest_m, layers, numbers)
    return signed(discharge, sea_m, basin_m), area, mean_width(area, top - crest_m)


@compiled_relation
def flood_flap(
    sea_m: float, basin_m: float, crest_m: float, layers: FloatArray, numbers: FloatArray
) -> tuple[float, float, float]:
    """Flow through an opening whose flap lets the flood in and shuts against the ebb."""
    discharge, area, top = _flap(max(sea_m, basin_m), min(sea_m, basin_m), sea_m > basin_m, crest_m, layers, numbers)
    return signed(discharge, sea_m, basin_m), area, mean_width(area, top - crest_m)
