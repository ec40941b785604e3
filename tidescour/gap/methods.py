"""The methods of this step that the plan does not choose between, for the listing and the report."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Final

from tidescour.gap.routing import basin_levels
from tidescour.table import Entry

METHODS: Final[tuple[Entry[Callable[..., Any]], ...]] = (
    Entry(
        name="basin-routing",
        title="Basin level through its storage: dV/dt = sum of discharges + inflow",
        function=basin_levels,
        validity="basin short against the tidal wave (about 1/20 of its length), water level in it, no inertia in the "
        "gap, sea tide not changed by the works",
        source="continuity; implicit step of second order after Alexander (1977), SIAM J. Numer. Anal. 14(6)",
        confidence="derived",
    ),
)
