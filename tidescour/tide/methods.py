"""The methods of this step that the plan does not choose between, for the listing and the report."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Final

from tidescour.table import Entry, symbols
from tidescour.tide.fit import fit_record

METHODS: Final[tuple[Entry[Callable[..., Any]], ...]] = (
    Entry(
        name="harmonic-fit",
        title="Harmonic least squares with exact nodal corrections",
        function=fit_record,
        says="z(t) = z_0 + sum of f(t) H cos(V(t) + u(t) - G), one term a constituent: z_0, H and G by least squares "
        "on the good samples, without trend\n"
        "prediction: z_0 + sea_factor times the sum, and set_up_m (at sea)",
        symbols=symbols(
            ("z", "m", "level above the datum"),
            ("z_0", "m", "mean level"),
            ("H", "m", "amplitude of a constituent"),
            ("G", "deg", "its phase lag behind Greenwich"),
            ("V", "deg", "its astronomical argument at Greenwich"),
            ("f", "-", "its nodal factor"),
            ("u", "deg", "its nodal angle"),
            ("t", "s", "time"),
            ("sea_factor", "-", "of the plan"),
            ("set_up_m", "m", "of the plan"),
        ),
        validity="15 days of good samples or more; astronomical tide only; constants of a basin hold only for "
        "the gap that they were measured with",
        source="Codiga (2011), Unified tidal analysis and prediction using the UTide Matlab functions, University of "
        "Rhode Island, GSO Technical Report 2011-01, by the library utide",
        confidence="published",
        left_by=(
            "no-tide",
            "constituents-not-separable",
            "neighbour-missing",
            "fit-ill-conditioned",
            "latitude-near-equator",
        ),
        leads_to=("samples-thinned", "phase-reference"),
    ),
)
