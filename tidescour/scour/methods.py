"""The methods of this step that the plan does not choose between, for the listing and the report."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Final

from tidescour.scour.chain import chain_place
from tidescour.scour.cycles import stage_cycles
from tidescour.scour.durations import effective_duration
from tidescour.scour.length import required_length
from tidescour.table import Entry

METHODS: Final[tuple[Entry[Callable[..., Any]], ...]] = (
    Entry(
        name="cycles",
        title="Tidal cycles from one turn to flood to the next",
        function=stage_cycles,
        validity="turns told from noise by 2 cm of head (or a twentieth of the largest) and 6 h",
        source="common practice, no source",
        confidence="common practice",
    ),
    Entry(
        name="effective-duration",
        title="Hours of the reference velocity that do what the whole tide does",
        function=effective_duration,
        validity="quasi-steady growth that depends on the present depth only, no infill; integral: the tide chained in "
        "small steps; flow-mean and cycle-mean: handbook averages, which change when the tide is cut in two",
        source="derived from the growth law: d(h^(1/gamma))/dt = (c E^q h0^r)^(1/gamma)",
        confidence="derived",
    ),
    Entry(
        name="chain",
        title="Growth from stage to stage by equivalent time",
        function=chain_place,
        validity="one power law for all stages: then the order of the stages does not matter",
        source="derived: h_n^(1/gamma) = h_0^(1/gamma) + sum of A_i^(1/gamma) t_i",
        confidence="derived",
    ),
    Entry(
        name="required-length",
        title="Length of protection: L = n x final depth(L), at least 6 sill heights",
        function=required_length,
        validity="one slide to a slope of 1 in n from the deepest point; n is a geotechnical choice (6 for normally "
        "packed sand, 15 to 20 for loose sand are in use, from memory)",
        source="Dutch closure practice (from memory)",
        confidence="from memory",
    ),
)
