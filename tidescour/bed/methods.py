"""The methods of this step that the plan does not choose between, for the listing and the report."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Final

from tidescour.bed.alpha import alpha_factor
from tidescour.bed.end_velocity import conjugate_depth, end_velocity
from tidescour.bed.threshold import critical_velocity
from tidescour.bed.water import dynamic_viscosity, water_density
from tidescour.table import Entry

METHODS: Final[tuple[Entry[Callable[..., Any]], ...]] = (
    Entry(
        name="water-density",
        title="Density of water at one atmosphere (EOS-80)",
        function=water_density,
        validity="0 to 42 g/kg, -2 to 40 C",
        source="Fofonoff and Millard (1983), UNESCO Technical Papers in Marine Science 44, eqs 13 and 14",
        confidence="published",
    ),
    Entry(
        name="water-viscosity",
        title="Dynamic viscosity of water",
        function=dynamic_viscosity,
        validity="0 to 150 g/kg, 0 to 180 C, 1.5 %",
        source="Sharqawy, Lienhard and Zubair (2010), Desalination and Water Treatment 16, eqs 22 and 23 (from memory)",
        confidence="from memory",
    ),
    Entry(
        name="critical-velocity",
        title="Depth-mean critical velocity: Shields number, then Chezy coefficient 18 log10(12 h0 / ks)",
        function=critical_velocity,
        validity="sand without cohesion, d50 0.1 to 2 mm; ks = roughness_d50 x d50; h0 the mean depth of the stage",
        source="rough-bed logarithmic law, as in Soulsby (1997), Dynamics of Marine Sands (from memory)",
        confidence="from memory",
    ),
    Entry(
        name="end-velocity",
        title="Velocity at the end of the protection: u = factor |Q| / ((B + 2 widening L) h0)",
        function=end_velocity,
        validity="level water, no lateral reduction unless the plan orders it; the centre of a jet keeps its velocity "
        "over about six widths, so that widening is not cautious for the deepest point",
        source="continuity",
        confidence="derived",
    ),
    Entry(
        name="jump",
        title="Tailwater that holds a hydraulic jump",
        function=conjugate_depth,
        validity="level bed, no loss of energy over the sill",
        source="momentum over a jump (Belanger), as in Chow (1959), Open-Channel Hydraulics, ch. 15 (from memory)",
        confidence="from memory",
    ),
    Entry(
        name="alpha",
        title="Disturbance factor alpha = 1.5 + 5 r0 f_C behind a sill and its protection",
        function=alpha_factor,
        validity="sill over the bed at the protection's end, D > 0; L > 6 D; D <= 0.8 h0; width-mean flow, not the "
        "eddies at dam heads (alpha 3 to 4.5 has been used there, from memory)",
        source="Hoffmans and Booij (1993); Hoffmans and Verheij (1997), Scour Manual (from memory)",
        confidence="from memory",
    ),
)
