"""Entries of the table of discharge relations: crests and open gaps."""

from __future__ import annotations

import math
from typing import Final

from tidescour.gap.crests import broad_crest, narrow_crest, open_gap
from tidescour.gap.relation_parts import BOTH_LEVELS, GRAVITY, Kernel, coefficient
from tidescour.table import Entry, Parameter, symbols


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


CREST_RELATIONS: Final[tuple[Entry[Kernel], ...]] = (
    Entry(
        name="broad-crest",
        title="Broad crest, free or drowned",
        function=broad_crest,
        says="Q = m A(z) sqrt(2 g (E - z)), z the higher of z_c and z2; Q = 0 where the crest is dry\n"
        "E = z1, or z1 + (Q / A1)^2 / (2 g) where an approach is given\n"
        "with a modular limit S: free up to z2 - z_k = S (E - z_k); beyond it z = z2, and m is raised so that Q is "
        "continuous (for a rectangle to 0.3849 m / (S sqrt(1 - S)))",
        symbols=symbols(
            *BOTH_LEVELS,
            ("m", "-", "coefficient"),
            ("z", "m", "level in the control section above the datum"),
            ("z_c", "m", "critical level, at which most passes with the energy level E"),
            ("A", "m2", "area of the section under the level z"),
            ("E", "m", "energy level upstream above the datum"),
            ("z_k", "m", "crest above the datum"),
            ("A1", "m2", "area of the approach upstream: its width times its depth"),
            ("S", "-", "modular_limit"),
        ),
        parameters=(
            coefficient(
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
        left_by=("approach-twice", "approach-width", "approach-bed"),
    ),
    Entry(
        name="narrow-crest",
        title="Narrow or sharp crest, drowned after Villemonte",
        function=narrow_crest,
        says="Q = Q_f (1 - (h2 / h1)^n)^0.385 where h2 is over 0, else Q_f\n"
        "Q_f = m A(y_c) sqrt(2 g (h1 - y_c)), n = h1 / (2 (h1 - y_c)): 1.5 for a rectangle, 2.5 for a triangle",
        symbols=symbols(
            ("Q", "m3/s", "discharge, towards the lower side"),
            ("Q_f", "m3/s", "the same without the tailwater"),
            ("h1", "m", "upstream level over the crest"),
            ("h2", "m", "downstream level over the crest"),
            ("n", "-", "exponent of the law of free flow"),
            ("m", "-", "coefficient"),
            ("A", "m2", "area of the section under that depth"),
            ("y_c", "m", "critical depth over the crest for the energy h1"),
            GRAVITY,
        ),
        parameters=(
            coefficient(
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
        says="Q = sqrt(2 g (z1 - z)) / sqrt((1 / (mu A) - 1 / A2)^2 + 1 / A2^2 - 1 / A1^2 + f / A^2)\n"
        "z = z2, or the higher level in the gap with which most passes",
        symbols=symbols(
            *BOTH_LEVELS,
            ("z", "m", "level in the gap above the datum"),
            ("mu", "-", "coefficient: contraction of the jet"),
            ("A", "m2", "area of the gap under the level z"),
            ("A1", "m2", "area of the channel upstream, where the gauge stands"),
            ("A2", "m2", "area of the channel downstream, where the gauge stands"),
            ("f", "-", "friction"),
        ),
        parameters=(
            coefficient(
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
)
