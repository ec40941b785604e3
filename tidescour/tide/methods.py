"""The methods of this step that the plan does not choose between, for the listing and the report."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Final

from tidescour.table import Entry
from tidescour.tide.fit import fit_record

METHODS: Final[tuple[Entry[Callable[..., Any]], ...]] = (
    Entry(
        name="harmonic-fit",
        title="Harmonic least squares with exact nodal corrections",
        function=fit_record,
        validity="15 days of good samples or more; astronomical tide only; constants of a basin hold only for "
        "the gap that they were measured with",
        source="Codiga (2011), Unified tidal analysis and prediction using the UTide Matlab functions, University of "
        "Rhode Island, GSO Technical Report 2011-01, by the library utide",
        confidence="published",
    ),
)
