"""Which constituents a record can bear."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Final

import numpy as np

from tidescour.errors import DomainError, Finding, FitError
from tidescour.tide.library import constituent_frequencies, fitted_names, separable_constituents
from tidescour.units import SECONDS_PER_DAY, SECONDS_PER_HOUR

LONG_PERIOD: Final = ("SA", "SSA", "MSM", "MM", "MSF", "MF")
"""Constituents of weeks to a year: in a shorter record they are weather, not tide."""

YEAR_S: Final = 365.25 * SECONDS_PER_DAY

NYQUIST_SHARE: Final = 0.8
"""Highest frequency kept, as a share of half the sampling rate (common practice, no source)."""

EQUILIBRIUM_NEIGHBOURS: Final = (("S2", "K2", 0.272), ("K1", "P1", 0.331), ("N2", "NU2", 0.194))
"""A constituent, the small neighbour that a short record cannot tell from it, and the ratio of their amplitudes in the
equilibrium tide (Schureman, 1941, US Coast and Geodetic Survey Special Publication 98; from memory)."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ConstituentChoice:
    """Names of the constituents to fit, in words how they came about, and what a reader must know."""

    names: tuple[str, ...]
    text: str
    findings: tuple[Finding, ...] = ()


def choose_constituents(span_s: float, good_share: float, step_s: float) -> ConstituentChoice:
    """Constituents that a record can bear, as the plan's ``auto`` has them.

    The library's choice at Rayleigh 1 for `span_s` times `good_share`, without those above 0.8 of the Nyquist
    frequency, and under a year (365.25 days of that product) without SA, SSA, MSM, MM, MSF and MF.

    Parameters
    ----------
    span_s : float
        Time between the first and the last good sample [s], positive.
    good_share : float
        Good samples over those that a gapless record would have in that span, above 0, at most 1.
    step_s : float
        Commonest step between stamps [s], positive.

    Raises
    ------
    DomainError
        If a number is out of range.
    FitError
        If nothing can be told apart in so short a record.
    """
    length_s = _effective_length(span_s, good_share, step_s)
    separable = separable_constituents(length_s)
    frequencies = constituent_frequencies(separable)
    long_period = LONG_PERIOD if length_s < YEAR_S else ()
    too_fast = [
        name for name, each in zip(separable, frequencies, strict=True) if each > _highest_frequency_per_h(step_s)
    ]
    names = tuple(name for name in separable if name not in long_period and name not in too_fast)
    if not names:
        raise FitError(
            f"{length_s / SECONDS_PER_HOUR:.1f} h of good samples every {step_s:g} s tell no tide; give a longer record"
        )
    left_out = [name for name in separable if name not in names]
    text = (
        f"auto: Rayleigh 1 for {span_s / SECONDS_PER_DAY:.2f} d x {good_share:.4f} of good samples, "
        f"{len(names)} constituents; left out: {', '.join(left_out) or 'none'}"
    )
    return ConstituentChoice(names=names, text=text)


def check_constituents(
    constituents: Sequence[str], inferred: Collection[str], span_s: float, good_share: float, step_s: float
) -> ConstituentChoice:
    """Constituents that the plan lists, checked against what the record can bear.

    Parameters
    ----------
    constituents : sequence of str
        The list of the plan.
    inferred : collection of str
        Those of them that are inferred and need not be told apart.
    span_s, good_share, step_s : float
        As in `choose_constituents`.

    Returns
    -------
    ConstituentChoice
        The list as given; a warning for each two neighbours that are under one cycle apart over the record.

    Raises
    ------
    DomainError
        If a number is out of range.
    FitError
        If a name is unknown or stands twice, or a frequency lies above 0.8 of the Nyquist frequency.
    """
    length_s = _effective_length(span_s, good_share, step_s)
    names = fitted_names(constituents, {})
    frequencies = constituent_frequencies(names)
    highest = _highest_frequency_per_h(step_s)
    too_fast = [name for name, each in zip(names, frequencies, strict=True) if each > highest]
    if too_fast:
        raise FitError(
            f"tide.constituents: {', '.join(too_fast)} cannot be told from slower ones in samples every {step_s:g} s "
            f"(over {NYQUIST_SHARE:g} of the Nyquist frequency, {highest:.4f} cycles per hour); leave them out"
        )
    fitted = sorted((each, name) for name, each in zip(names, frequencies, strict=True) if name not in inferred)
    findings = tuple(
        Finding(
            severity="warning",
            code="constituents-not-separable",
            where="tide.constituents",
            message=(
                f"{slow} and {fast} need {1.0 / (24.0 * (high - low)):.1f} days to be told apart, the record holds "
                f"{length_s / SECONDS_PER_DAY:.1f}: leave the smaller one out or infer it"
            ),
        )
        for (low, slow), (high, fast) in pairwise(fitted)
        if (high - low) * length_s < SECONDS_PER_HOUR
    )
    return ConstituentChoice(names=names, text=f"listed in the plan: {len(names)} constituents", findings=findings)


def missing_neighbours(names: Collection[str], where: str) -> tuple[Finding, ...]:
    """Warn of small neighbours that are neither fitted nor inferred: their larger one then drifts over the year."""
    missing = [row for row in EQUILIBRIUM_NEIGHBOURS if row[0] in names and row[1] not in names]
    if not missing:
        return ()
    remedy = ", ".join(f'{small} = ["{large}", {ratio}, 0.0]' for large, small, ratio in missing)
    pairs = ", ".join(
        f"without {small} those of {large} wander by up to {100.0 * ratio:.0f} %" for large, small, ratio in missing
    )
    message = (
        f"small neighbours neither fitted nor inferred, so that constants hold for the season of the record only: "
        f"{pairs}; tide.infer = {{ {remedy} }} takes the ratios of the equilibrium tide, those of a near port are "
        "better"
    )
    return (Finding(severity="warning", code="neighbour-missing", where=where, message=message),)


def _highest_frequency_per_h(step_s: float) -> float:
    return NYQUIST_SHARE * 0.5 * SECONDS_PER_HOUR / step_s


def _effective_length(span_s: float, good_share: float, step_s: float) -> float:
    if not (np.isfinite(span_s) and span_s > 0.0 and np.isfinite(step_s) and step_s > 0.0):
        raise DomainError(f"span {span_s} s and step {step_s} s of a record must be positive")
    if not 0.0 < good_share <= 1.0:
        raise DomainError(f"share of good samples {good_share} must lie above 0 and not above 1")
    return span_s * good_share
