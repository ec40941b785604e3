"""The codes of findings that qualify no method and tell of nothing left out: their messages say all."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Final

OTHER_FINDINGS: Final[Mapping[str, tuple[str, ...]]] = {
    "the plan": (
        "default-used",
        "fines-credited",
        "opening-renamed",
        "sea-change",
        "soundings-not-complete",
    ),
    "records and series": (
        "averaged",
        "averaging-damps",
        "basin-larger",
        "basin-leads",
        "coarse-series",
        "correction-applied",
        "correction-idle",
        "cut-short",
        "decimal-comma",
        "doubled-hour",
        "doubled-stamps",
        "encoding",
        "excluded",
        "feet-ratio",
        "footer",
        "gaps",
        "header-row",
        "infinite-values",
        "leap-second",
        "lines-above-header",
        "load-case-jump",
        "midnight-24",
        "missing-among-values",
        "missing-values",
        "mixed-offsets",
        "no-overlap",
        "nul-tail",
        "odd-characters",
        "out-of-order",
        "overlap",
        "overlap-merged",
        "repeated-header",
        "repeated-rows",
        "reversed",
        "rows-left-out",
        "sensor-range",
        "serial-dates",
        "sides-compared",
        "sides-not-compared",
        "trailing-delimiter",
        "unit-in-header",
        "unit-row",
    ),
    "what comes of the works": (
        "delay-not-computed",
        "delay-on-the-calendar",
        "delay-without-result",
        "overtopping",
    ),
}
"""What they are about, and the codes."""


def about(code: str) -> str | None:
    """Return what the findings of a code are about; None where it is not among these."""
    return next((subject for subject, codes in OTHER_FINDINGS.items() if code in codes), None)
