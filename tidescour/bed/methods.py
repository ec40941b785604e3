"""The methods of this step that the plan does not choose between, for the listing and the report."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Final

from tidescour.bed.alpha import alpha_factor, implied_turbulence
from tidescour.bed.end_velocity import conjugate_depth, end_velocity
from tidescour.bed.layers import bed_layers
from tidescour.bed.slope import slide_retreat, upstream_slope_cot
from tidescour.bed.threshold import closed_form_critical_velocity, critical_velocity
from tidescour.bed.water import dynamic_viscosity, water_density
from tidescour.table import Entry, symbols

METHODS: Final[tuple[Entry[Callable[..., Any]], ...]] = (
    Entry(
        name="water-density",
        title="Density of water at one atmosphere (EOS-80)",
        function=water_density,
        says="rho = a + b S + c S^1.5 + 4.8314e-4 S^2\n"
        "a = 999.842594 + 6.793952e-2 t - 9.095290e-3 t^2 + 1.001685e-4 t^3 - 1.120083e-6 t^4 + 6.536332e-9 t^5\n"
        "b = 0.824493 - 4.0899e-3 t + 7.6438e-5 t^2 - 8.2467e-7 t^3 + 5.3875e-9 t^4\n"
        "c = -5.72466e-3 + 1.0227e-4 t - 1.6546e-6 t^2",
        symbols=symbols(
            ("rho", "kg/m3", "density of the water"),
            ("S", "g/kg", "salinity"),
            ("t", "C", "temperature"),
            ("a", "-", "the same in fresh water, as a number"),
            ("b", "-", "first part of what the salt adds"),
            ("c", "-", "second part of it"),
        ),
        validity="0 to 42 g/kg, -2 to 40 C",
        source="Fofonoff and Millard (1983), UNESCO Technical Papers in Marine Science 44, eqs 13 and 14",
        confidence="published",
    ),
    Entry(
        name="water-viscosity",
        title="Dynamic viscosity of water",
        function=dynamic_viscosity,
        says="mu = m (1 + a S + b S^2), m = 4.2844e-5 + 1 / (0.157 (t + 64.993)^2 - 91.296)\n"
        "a = 1.541 + 1.998e-2 t - 9.52e-5 t^2, b = 7.974 - 7.561e-2 t + 4.724e-4 t^2\n"
        "nu = mu / rho",
        symbols=symbols(
            ("mu", "Pa s", "dynamic viscosity"),
            ("m", "Pa s", "the same of fresh water"),
            ("S", "kg/kg", "salinity"),
            ("t", "C", "temperature"),
            ("a", "-", "first factor of the salt"),
            ("b", "-", "second factor of the salt"),
            ("nu", "m2/s", "kinematic viscosity"),
            ("rho", "kg/m3", "density"),
        ),
        validity="0 to 150 g/kg, 0 to 180 C, 1.5 %",
        source="Sharqawy, Lienhard and Zubair (2010), Desalination and Water Treatment 16, eqs 22 and 23 (from memory)",
        confidence="from memory",
    ),
    Entry(
        name="critical-velocity",
        title="Depth-mean critical velocity: Shields number, then the velocity profile",
        function=critical_velocity,
        says="u_c = (u / u*) u*_c, u*_c = sqrt(theta_c g Delta d50), u / u* by velocity_profile with ks = "
        "roughness_d50 times d50",
        symbols=symbols(
            ("u_c", "m/s", "mean velocity over the depth at which the bed begins to move"),
            ("u", "m/s", "mean velocity over the depth"),
            ("u*", "m/s", "shear velocity"),
            ("u*_c", "m/s", "shear velocity at which the bed begins to move"),
            ("theta_c", "-", "critical Shields parameter"),
            ("Delta", "-", "density of the grains over that of the water, less 1"),
            ("d50", "m", "median grain size"),
            ("ks", "m", "roughness of the bed"),
            ("g", "m/s2", "9.81"),
        ),
        validity="sand without cohesion, d50 0.1 to 2 mm; ks = roughness_d50 x d50; h0 the mean depth of the stage",
        source="definition of the Shields number, as in Soulsby (1997), Dynamics of Marine Sands (from memory)",
        confidence="from memory",
        left_by=("grain-outside-evidence", "threshold-forms-differ", "fines-not-credited"),
    ),
    Entry(
        name="closed-form-threshold",
        title="Critical velocity of quartz in closed form, to hold the computed one against",
        function=closed_form_critical_velocity,
        says="u_c = 0.19 d50^0.1 log10(4 h0 / d90) up to d50 = 0.5 mm, 8.5 d50^0.6 log10(4 h0 / d90) over it",
        symbols=symbols(
            ("u_c", "m/s", "critical velocity"),
            ("d50", "m", "median grain size"),
            ("d90", "m", "grain size that 90 % by mass is finer than"),
            ("h0", "m", "water depth at the end of the protection"),
        ),
        validity="quartz in fresh water of 15 C, d50 0.1 to 2 mm",
        source="van Rijn (1984), Journal of Hydraulic Engineering 110(10), part I (from memory)",
        confidence="from memory",
        left_by=("threshold-forms-differ",),
    ),
    Entry(
        name="layers",
        title="Layers under the bed: each has its own threshold from the depth at which the hole reaches it",
        function=bed_layers,
        says="u_c is that of a layer from h = z_b - z_l on, h the depth of the hole",
        symbols=symbols(
            ("u_c", "m/s", "critical velocity at the bottom of the hole"),
            ("h", "m", "depth of the hole"),
            ("z_b", "m", "original bed above the datum"),
            ("z_l", "m", "top of the layer above the datum"),
        ),
        validity="level layers without cohesion, or with a threshold from erosion tests; the threshold at the depth of "
        "water over the original bed",
        source="the threshold is that of the material at the bottom of the hole",
        confidence="derived",
        left_by=("layer-at-surface", "layer-reached"),
    ),
    Entry(
        name="end-velocity",
        title="Velocity at the end of the protection",
        function=end_velocity,
        says="u = f |Q| / (W h0)",
        symbols=symbols(
            ("u", "m/s", "mean velocity over the depth at the end of the protection"),
            ("f", "-", "local_velocity_factor"),
            ("Q", "m3/s", "discharge of the opening towards that side"),
            ("W", "m", "width after spreading"),
            ("h0", "m", "water depth at the end of the protection"),
        ),
        validity="level water, the depth of the receiving side at the same time",
        source="continuity",
        confidence="derived",
    ),
    Entry(
        name="jump",
        title="Tailwater that holds a hydraulic jump",
        function=conjugate_depth,
        says="y2 = y1 / 2 (sqrt(1 + 8 q^2 / (g y1^3)) - 1), y1 the smaller depth with E = y1 + q^2 / (2 g y1^2)\n"
        "y1 is the critical depth where E is too small for q; out of range where h0 is under y2, or u / sqrt(g h0) "
        "over 1",
        symbols=symbols(
            ("y2", "m", "depth that holds the jump"),
            ("y1", "m", "depth of the jet on the bed"),
            ("q", "m2/s", "discharge over the width at the end of the protection"),
            ("E", "m", "upstream level over the bed at the end of the protection"),
            ("u", "m/s", "velocity there"),
            ("h0", "m", "water depth at the end of the protection"),
            ("g", "m/s2", "9.81"),
        ),
        validity="level bed, no loss of energy over the sill",
        source="momentum over a jump (Belanger), as in Chow (1959), Open-Channel Hydraulics, ch. 15 (from memory)",
        confidence="from memory",
        left_by=("swept-out-jump",),
    ),
    Entry(
        name="alpha",
        title="Disturbance factor behind a sill and its protection",
        function=alpha_factor,
        says="alpha = 1.5 + 5 r0 f_C, f_C = max(1, C / 40)\n"
        "r0 = sqrt(0.0225 (1 - D / h0)^-2 ((L - 6 D) / (6.67 h0) + 1)^-1.08 + 1.45 g / C^2)",
        symbols=symbols(
            ("alpha", "-", "disturbance factor"),
            ("r0", "-", "relative turbulence over the depth"),
            ("f_C", "-", "factor of a smooth protection"),
            ("C", "m^0.5/s", "Chezy coefficient of the protection"),
            ("D", "m", "sill over the bed at the end of the protection"),
            ("h0", "m", "mean water depth there in the stage"),
            ("L", "m", "length of the protection"),
            ("g", "m/s2", "9.81"),
        ),
        validity="sill over the bed at the protection's end, D > 0; L > 6 D; D <= 0.8 h0; width-mean flow, not the "
        "eddies at dam heads (alpha 3 to 4.5 has been used there, from memory)",
        source="Hoffmans and Booij (1993); Hoffmans and Verheij (1997), Scour Manual (from memory)",
        confidence="from memory",
        left_by=("swept-out-jump",),
    ),
    Entry(
        name="turbulence",
        title="Relative turbulence of a given alpha",
        function=implied_turbulence,
        says="r0 = (alpha - 1.5) / (5 f_C), no less than sqrt(1.45 g) / C; f_C = max(1, C / 40)",
        symbols=symbols(
            ("r0", "-", "relative turbulence over the depth"),
            ("alpha", "-", "disturbance factor"),
            ("f_C", "-", "factor of a smooth protection"),
            ("C", "m^0.5/s", "Chezy coefficient of the protection, 40 where it is not given"),
            ("g", "m/s2", "9.81"),
        ),
        validity="not under the uniform flow's sqrt(1.45 g) / C; on the high side where alpha holds a local velocity",
        source="Hoffmans and Booij (1993); Hoffmans and Verheij (1997), Scour Manual (from memory), solved for r0",
        confidence="from memory",
    ),
    Entry(
        name="upstream-slope",
        title="Slope towards the protection while the hole grows",
        function=upstream_slope_cot,
        says="sin(beta) = 3e-4 u^2 / (Delta g d50) + (0.11 + 0.75 r0) f_C",
        symbols=symbols(
            ("beta", "deg", "slope of the hole towards the protection"),
            ("u", "m/s", "velocity at the end of the protection"),
            ("Delta", "-", "density of the grains over that of the water, less 1"),
            ("d50", "m", "median grain size"),
            ("r0", "-", "relative turbulence there"),
            ("f_C", "-", "factor of a smooth protection"),
            ("g", "m/s2", "9.81"),
        ),
        validity="sand without cohesion, beta up to the natural slope of 35 degrees",
        source="Hoffmans and Pilarczyk (1995), Journal of Hydraulic Engineering 121(4) (from memory)",
        confidence="from memory",
    ),
    Entry(
        name="slide-retreat",
        title="Retreat of the upper edge in a single slide that keeps its area",
        function=slide_retreat,
        says="R = y (n_1 - n_0) / 2",
        symbols=symbols(
            ("R", "m", "retreat of the upper edge"),
            ("y", "m", "height of the slope"),
            ("n_0", "-", "slope 1 in n_0 before the slide"),
            ("n_1", "-", "slope 1 in n_1 after it"),
        ),
        validity="one slide of a straight slope; slides that follow each other add up, so that it is no bound for them",
        source="equal areas of cut and fill",
        confidence="derived",
    ),
)
