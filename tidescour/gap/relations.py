"""The table of discharge relations: from the levels on both sides of an opening to its discharge.

Every kernel has one signature: sea level, basin level and crest [m above datum], the section's layers, and the entry's
own numbers in their order; it returns the discharge [m3/s, positive from sea to basin], and area [m2] and mean width
[m] of the control section. A new relation is one kernel and one entry.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping

import numpy as np

from tidescour.errors import DomainError
from tidescour.gap.conduits import culvert, ebb_flap, flood_flap, orifice
from tidescour.gap.crests import broad_crest, narrow_crest, open_gap
from tidescour.gap.rubble import rubble_dam
from tidescour.gap.section import Section
from tidescour.table import Entry, Parameter
from tidescour.units import FloatArray, read_only

Kernel = Callable[[float, float, float, FloatArray, FloatArray], tuple[float, float, float]]


def _coefficient(meaning: str, high: float = 3.0, default: float | None = None) -> Parameter:
    return Parameter(name="coefficient", unit="-", low=0.0, high=high, meaning=meaning, default=default)


def _approach(side: str) -> tuple[Parameter, Parameter]:
    width, bed = f"approach_width_{side}_m", f"approach_bed_{side}_m"
    return (
        Parameter(
            name=width,
            unit="m",
            low=0.0,
            high=1e6,
            meaning=f"width of the approach on the {side} side: with it the velocity head of the approach is counted",
            default=math.inf,
            together=bed,
        ),
        Parameter(
            name=bed,
            unit="m",
            low=-1e4,
            high=1e4,
            meaning=f"bed of the approach on the {side} side, level above the datum",
            default=-math.inf,
            together=width,
        ),
    )


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
    _coefficient("discharge coefficient with the flap open"),
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

RELATIONS: Mapping[str, Entry[Kernel]] = {
    entry.name: entry
    for entry in (
        Entry(
            name="broad-crest",
            title="Broad crest, free or drowned",
            function=broad_crest,
            parameters=(
                _coefficient(
                    "discharge coefficient m; 0.80 to 1.10 is common for rubble sills, above 1 is physical "
                    "early in a closure, when the gauges stand beyond the zone where the jet's head is won back"
                ),
                Parameter(
                    name="modular_limit",
                    unit="-",
                    low=0.0,
                    high=0.95,
                    meaning="tailwater over energy, both over the crest, at which the crest drowns: 0.80 to 0.85 for "
                    "back faces of 1 in 4 and gentler; without it, or below the critical ratio (2/3 for a rectangle), "
                    "the energy equation holds",
                    default=0.0,
                ),
                *_approach("sea"),
                *_approach("basin"),
            ),
            validity="crest longer than about half the head over it; parallel streamlines over the crest; without "
            "approach widths and beds: level water on both sides, gap area below about half of the channel's; with "
            "them a coefficient over 1 would count the approach twice; refused where the approach is no larger than "
            "coefficient times gap",
            source="Energy equation at the control section; Encyclopaedia Britannica, 11th ed. (1910), Hydraulics, "
            "section 44; other sections by the same rule of the largest discharge; modular limits after Bos (1989), "
            "Discharge measurement structures, ILRI 20 (from memory)",
            confidence="published",
        ),
        Entry(
            name="narrow-crest",
            title="Narrow or sharp crest, drowned after Villemonte",
            function=narrow_crest,
            parameters=(
                _coefficient(
                    "discharge coefficient m over that of a rectangular broad crest, 1.705 B H^1.5 (SI); about 1.08 "
                    "for a sharp crest"
                ),
            ),
            validity="crest shorter than about half the head over it: sheet piles, caisson walls; some 5 % when "
            "drowned; not for wide rubble sills, of which it takes 26 % too little at the limit of free flow",
            source="Villemonte (1947), Submerged-weir discharge studies, Engineering News-Record 139",
            confidence="published",
        ),
        Entry(
            name="open-gap",
            title="Open gap: contraction, and head won back in the sudden expansion",
            function=open_gap,
            parameters=(
                _coefficient(
                    "contraction of the jet at the dam heads; 0.80 to 0.95 rounded or sloping, 0.6 to 0.7 sharp",
                    high=1.0,
                ),
                Parameter(
                    name="friction",
                    unit="-",
                    low=0.0,
                    high=100.0,
                    meaning="friction term f L / (4 R) of the gap's own length",
                    default=0.0,
                ),
                Parameter(
                    name="channel_area_sea_m2",
                    unit="m2",
                    low=0.0,
                    high=1e9,
                    meaning="wet area of the channel on the sea side where the gauge stands, at mean level",
                ),
                Parameter(
                    name="channel_area_basin_m2",
                    unit="m2",
                    low=0.0,
                    high=1e9,
                    meaning="wet area of the channel on the basin side where the gauge stands, at mean level",
                ),
            ),
            validity="gap without a sill, levels taken beyond the zone where head is won back; channel areas that "
            "vary little with the tide; refused where the gap is over 0.8 of a channel",
            source="Energy to the vena contracta and momentum in the expansion (Borda-Carnot)",
            confidence="derived",
        ),
        Entry(
            name="orifice",
            title="Orifice: under a gate or lintel, free or drowned",
            function=orifice,
            parameters=(_HEIGHT, _coefficient("discharge coefficient besides the contraction"), _CONTRACTION),
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
            parameters=(
                _HEIGHT,
                _coefficient("further factor on the discharge", default=1.0),
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
            parameters=_FLAP,
            validity=_FLAP_VALIDITY,
            source=_FLAP_SOURCE,
            confidence="derived",
        ),
        Entry(
            name="flood-flap",
            title="Flap that lets the flood in and shuts against the ebb",
            function=flood_flap,
            parameters=_FLAP,
            validity=_FLAP_VALIDITY,
            source=_FLAP_SOURCE,
            confidence="derived",
        ),
        Entry(
            name="rubble-dam",
            title="Flow through a dam of stones",
            function=rubble_dam,
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
}

KERNELS: tuple[Kernel, ...] = tuple(entry.function for entry in RELATIONS.values())
CODES: Mapping[str, int] = {name: code for code, name in enumerate(RELATIONS)}
NO_VALUE_REMEDY = (
    "what leads to the gap must be larger than the gap: for an open gap correct channel_area_sea_m2 and "
    "channel_area_basin_m2, or give it some friction; for a broad crest correct approach_width and approach_bed, take "
    "a smaller coefficient or modular_limit, or leave the approach out"
)
NUMBERS_AT_MOST = max(len(entry.parameters) for entry in RELATIONS.values())


def relation_numbers(name: str, values: Mapping[str, float]) -> FloatArray:
    """Return a relation's numbers in the order of its table entry, as its kernel wants them.

    Raises
    ------
    DomainError
        If the relation is not in the table, or a number is missing or outside its range.
    """
    if name not in RELATIONS:
        raise DomainError(f"relation {name!r} is not in the table; it has {', '.join(RELATIONS)}")
    numbers = np.zeros(NUMBERS_AT_MOST)
    for position, parameter in enumerate(RELATIONS[name].parameters):
        if parameter.name not in values and parameter.default is not None:
            numbers[position] = parameter.default
            continue
        value = values.get(parameter.name, np.nan)
        if not parameter.allows(value):
            raise DomainError(
                f"relation {name}: {parameter.name} = {value:g} must be over {parameter.low:g} and at most "
                f"{parameter.high:g}"
            )
        if parameter.together and parameter.together not in values:
            raise DomainError(f"relation {name}: {parameter.name} needs {parameter.together} beside it")
        numbers[position] = value
    return read_only(numbers)


def opening_discharge(
    relation: str, values: Mapping[str, float], section: Section, sea_level_m: FloatArray, basin_level_m: FloatArray
) -> FloatArray:
    """Return the discharge of an opening by one relation of the table.

    Parameters
    ----------
    relation : str
        Name in the table.
    values : mapping of str to float
        The relation's own numbers, such as ``coefficient``.
    section : Section
        Crest and wet area.
    sea_level_m, basin_level_m : (n,) array
        Levels on both sides [m above datum].

    Returns
    -------
    (n,) array
        Discharge [m3/s], positive from sea to basin; 0 where the crest is dry; NaN where a level is NaN, or the
        relation has no value.

    Raises
    ------
    DomainError
        If shapes differ, or the relation or one of its numbers is not right.
    """
    if sea_level_m.shape != basin_level_m.shape or sea_level_m.ndim != 1:
        raise DomainError("sea_level_m and basin_level_m must be two rows of one length")
    numbers = relation_numbers(relation, values)
    kernel = RELATIONS[relation].function
    discharge = np.full(sea_level_m.shape, np.nan)
    known = np.isfinite(sea_level_m) & np.isfinite(basin_level_m)
    discharge[known] = [
        kernel(sea, basin, section.crest_level_m, section.layers, numbers)[0]
        for sea, basin in zip(sea_level_m[known], basin_level_m[known], strict=True)
    ]
    return discharge
