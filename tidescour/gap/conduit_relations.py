"""Entries of the table of discharge relations: openings with a roof, and dams of stones."""

from __future__ import annotations

import math
from typing import Final

from tidescour.gap.conduits import culvert, ebb_flap, flood_flap, orifice
from tidescour.gap.relation_parts import BOTH_LEVELS, Kernel, coefficient
from tidescour.gap.rubble import rubble_dam
from tidescour.table import Entry, Parameter, symbols

_HEIGHT = Parameter(name="height_m", unit="m", low=0.0, high=1e3, meaning="clear height of the opening over its sill")
_CONTRACTION = Parameter(
    name="contraction",
    unit="-",
    low=0.0,
    high=1.0,
    meaning="height of the jet over that of the opening; 0.61 sharp edge, 1 well rounded",
    default=0.61,
)
_FLAP = (
    _HEIGHT,
    coefficient("discharge coefficient with the flap open"),
    Parameter(
        name="leak",
        unit="-",
        low=0.0,
        high=1.0,
        meaning="share of the coefficient that passes in the direction against which the flap shuts",
        default=0.0,
    ),
    Parameter(
        name="opening_head_m",
        unit="m",
        low=0.0,
        high=10.0,
        meaning="head that the flap's weight takes while it is open",
        default=0.0,
    ),
    _CONTRACTION,
)
_FLAP_VALIDITY = (
    "as the orifice; the flap follows the head without delay, its opening angle lies in coefficient and opening head"
)
_FLAP_SOURCE = "The orifice, in one direction; a tailwater higher by the opening head. Derived"
_ORIFICE_ROWS = (
    *BOTH_LEVELS,
    ("mu", "-", "coefficient"),
    ("A", "m2", "area of the opening under the level z"),
    ("z", "m", "level of the stream where it leaves, above the datum"),
    ("z_t", "m", "level against which it leaves, above the datum"),
    ("z_k", "m", "sill of the opening above the datum"),
    ("c", "-", "contraction"),
    ("a", "m", "height of the opening, height_m"),
)
_ORIFICE_SYMBOLS = symbols(*_ORIFICE_ROWS)
_FLAP_SYMBOLS = symbols(*_ORIFICE_ROWS, ("dz_o", "m", "opening_head_m"), ("l", "-", "leak"))


def _flap_says(opens: str, shuts: str) -> str:
    return (
        f"{opens}: the orifice with the tailwater raised by dz_o, not over z1\n"
        f"{shuts}: l Q of the orifice; Q = mu A(z) sqrt(2 g (z1 - z_t)), z_t the higher of z2 and the jet's top, which "
        "is not over z_k + c a"
    )


CONDUIT_RELATIONS: Final[tuple[Entry[Kernel], ...]] = (
    Entry(
        name="orifice",
        title="Orifice: under a gate or lintel, free or drowned",
        function=orifice,
        says="Q = mu A(z) sqrt(2 g (z1 - z_t)), z_t the higher of z2 and the jet's top, z = z_t, not over z_k + c a\n"
        "the jet's top: the critical level, but not over z_k + c a; a broad crest until the water touches the lintel, "
        "and no less from there on than when it touched",
        symbols=_ORIFICE_SYMBOLS,
        parameters=(_HEIGHT, coefficient("discharge coefficient besides the contraction"), _CONTRACTION),
        validity="upstream water still; between a jet that is just covered and one that is well drowned more "
        "passes than computed, for the jet keeps the tailwater off",
        source="Energy to the vena contracta; contraction of a sharp horizontal edge 0.61: Chow (1959), "
        "Open-Channel Hydraulics, ch. 17 (from memory)",
        confidence="from memory",
    ),
    Entry(
        name="culvert",
        title="Culvert: entrance or barrel, whichever lets less pass",
        function=culvert,
        says="Q = mu times the smaller of entrance and barrel, the entrance as the orifice with mu = 1\n"
        "barrel: A(z) sqrt(2 g (z1 - z_t)) / sqrt(1 + k_e + 2 g n^2 L / R^(4/3)), z_t the higher of z2 and the "
        "critical level, z and the critical level not over the roof",
        symbols=symbols(
            *BOTH_LEVELS,
            ("mu", "-", "coefficient"),
            ("A", "m2", "area of the barrels under the level z"),
            ("z", "m", "level of the stream where it leaves, above the datum"),
            ("z_t", "m", "level against which it leaves, above the datum"),
            ("k_e", "-", "entrance_loss"),
            ("n", "s/m^(1/3)", "roughness after Manning, manning_s_m13"),
            ("L", "m", "length of the barrel"),
            ("R", "m", "hydraulic radius of a barrel wet up to the upstream level, roof included where it is full"),
        ),
        parameters=(
            _HEIGHT,
            coefficient("further factor on the discharge", default=1.0),
            Parameter(name="length_m", unit="m", low=0.0, high=1e4, meaning="length of the barrel"),
            Parameter(
                name="manning_s_m13",
                unit="s/m^(1/3)",
                low=0.0,
                high=0.2,
                meaning="roughness of the barrel after Manning; 0.012 to 0.015 concrete",
            ),
            Parameter(
                name="entrance_loss",
                unit="-",
                low=0.0,
                high=5.0,
                meaning="entrance loss over the velocity head; 0.5 square edge, 0.2 rounded",
                default=0.5,
            ),
            _CONTRACTION,
            Parameter(
                name="barrels",
                unit="-",
                low=0.0,
                high=1e3,
                meaning="number of barrels that share the width",
                default=1.0,
            ),
        ),
        validity="straight barrel of one slope and section; friction of the water surface in a partly full barrel "
        "is only approached",
        source="Federal Highway Administration (2012), Hydraulic design of highway culverts, HDS-5, 3rd ed., ch. 3 "
        "(from memory); entrance as the orifice",
        confidence="from memory",
    ),
    Entry(
        name="ebb-flap",
        title="Flap that lets the ebb out and shuts against the flood",
        function=ebb_flap,
        says=_flap_says(opens="ebb", shuts="flood"),
        symbols=_FLAP_SYMBOLS,
        parameters=_FLAP,
        validity=_FLAP_VALIDITY,
        source=_FLAP_SOURCE,
        confidence="derived",
        left_by=("flap-inputs",),
    ),
    Entry(
        name="flood-flap",
        title="Flap that lets the flood in and shuts against the ebb",
        function=flood_flap,
        says=_flap_says(opens="flood", shuts="ebb"),
        symbols=_FLAP_SYMBOLS,
        parameters=_FLAP,
        validity=_FLAP_VALIDITY,
        source=_FLAP_SOURCE,
        confidence="derived",
        left_by=("flap-inputs",),
    ),
    Entry(
        name="rubble-dam",
        title="Flow through a dam of stones",
        function=rubble_dam,
        says="Q L = integral from z2 to z1 of A(z)^2 / (a A(z) + b Q) dz, z2 at least z_k\n"
        "a = alpha (1 - n)^2 nu / (n^3 g d^2), b = beta (1 - n) / (n^3 g d); for a rectangle without a: Q / B = "
        "sqrt((h1^3 - h2^3) / (3 b L))",
        symbols=symbols(
            *BOTH_LEVELS,
            ("L", "m", "length of the way through"),
            ("z_k", "m", "foot of the dam above the datum"),
            ("z", "m", "level in the dam above the datum"),
            ("A", "m2", "area of the dam under the level z"),
            ("a", "s/m", "laminar part of the gradient a u + b u^2 at the filter velocity u"),
            ("b", "s2/m2", "turbulent part of it"),
            ("alpha", "-", "forchheimer_laminar"),
            ("beta", "-", "forchheimer_turbulent"),
            ("n", "-", "porosity"),
            ("nu", "m2/s", "viscosity_m2_s"),
            ("d", "m", "stone_m"),
            ("B", "m", "width"),
            ("h1", "m", "upstream level over the foot"),
            ("h2", "m", "downstream level over the foot"),
        ),
        parameters=(
            Parameter(name="porosity", unit="-", low=0.05, high=0.7, meaning="pore space; about 0.4"),
            Parameter(name="stone_m", unit="m", low=0.001, high=5.0, meaning="size of the stones"),
            Parameter(name="length_m", unit="m", low=0.1, high=1e3, meaning="mean length of the way through"),
            Parameter(
                name="forchheimer_laminar",
                unit="-",
                low=0.0,
                high=1e5,
                meaning="alpha of the laminar part: 150 (Ergun), 1000 (van Gent)",
                default=150.0,
            ),
            Parameter(
                name="forchheimer_turbulent",
                unit="-",
                low=0.0,
                high=10.0,
                meaning="beta of the turbulent part: 1.75 (Ergun), 1.1 (van Gent), 1 to 3.6 for rock",
                default=1.75,
            ),
            Parameter(
                name="viscosity_m2_s",
                unit="m2/s",
                low=1e-7,
                high=1e-5,
                meaning="kinematic viscosity of the water",
                default=1.35e-6,
            ),
            Parameter(
                name="height_m",
                unit="m",
                low=0.0,
                high=1e3,
                meaning="height of the dam over its foot; what overtops it is another opening",
                default=math.inf,
            ),
        ),
        validity="upright faces (take the mean length), no seepage face, stone of one size; coefficients of "
        "Forchheimer's law differ by a factor of two between sources",
        source="Dupuit with Forchheimer's law; coefficients: Ergun (1952), Fluid flow through packed columns; van "
        "Gent (1995), Wave interaction with permeable coastal structures (from memory)",
        confidence="derived",
    ),
)
