"""The wall around the tide library: the only module that imports it.

Every call states every option, because most of the library's defaults are wrong for this work and few of its options
are checked. What is fenced, and why, is held by `tests/tide/test_library_fences.py`.
"""

from __future__ import annotations

import warnings
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from difflib import get_close_matches
from typing import Any, Final

import numpy as np

from tidescour.errors import DomainError, FitError
from tidescour.tide.records import TideConstants
from tidescour.units import SECONDS_PER_HOUR, FloatArray, datetime64_utc

MEAN_NAME: Final = "Z0"
"""The library's name for the mean, which every fit holds anyway; asked for as a constituent it makes a fit singular."""

SAMPLES_PER_CHUNK: Final = 5000
"""The library needs 8.7 kB a sample, whatever the list of constituents: 45 MB a chunk."""

SAMPLES_PER_PARAMETER: Final = 4
"""Fewest samples for each unknown of a fit (common practice, no source)."""

SMALLEST_LATITUDE_DEG: Final = 5.0
"""Nearer to the equator the library takes 5 degrees on the same side; at 0 itself it would divide by zero."""

AGENCY_NAMES: Final[Mapping[str, str]] = {"LAM2": "LDA2", "RHO": "RHO1", "M1": "NO1", "2MK3": "MO3"}
"""Names in common lists of constants, and the name of the same speed here."""


def constituent_names() -> tuple[str, ...]:
    """Return the names of all constituents that can be fitted or predicted, without the mean."""
    import utide

    return tuple(str(name) for name in utide.ut_constants.const.name if name != MEAN_NAME)


def name_problem(name: str) -> str | None:
    """Return what is wrong with the name of a constituent and what to write instead, or None where nothing is."""
    known = constituent_names()
    if name in known:
        return None
    if name == MEAN_NAME:
        return f"{MEAN_NAME} is the mean level, which is always fitted: leave it out"
    if name.upper() in AGENCY_NAMES:
        return f"{name!r} is called {AGENCY_NAMES[name.upper()]} here"
    nearest = get_close_matches(name.upper(), known, n=3, cutoff=0.5)
    return f"no constituent is called {name!r}" + (f"; nearest: {', '.join(nearest)}" if nearest else "")


def constituent_frequencies(constituents: Sequence[str]) -> FloatArray:
    """Return the frequencies of constituents [cycles per hour], in the order given.

    Raises
    ------
    FitError
        If a name is unknown.
    """
    import utide

    _check_names(constituents)
    return np.array([utide.cycles_per_hour[name] for name in constituents], dtype=np.float64)


def separable_constituents(length_s: float) -> tuple[str, ...]:
    """Return the constituents that the library would choose by itself at Rayleigh 1 for a gapless record.

    The library keeps, for each constituent, its distance in frequency to the next larger one; it chooses those that
    are at least one cycle a record apart, and looks at nothing else: not at holes, steps or noise.

    Parameters
    ----------
    length_s : float
        Length of the record [s], positive.

    Returns
    -------
    tuple of str
        By increasing frequency group; empty under about 12 h.
    """
    import utide

    const = utide.ut_constants.const
    least_separation_per_h = SECONDS_PER_HOUR / length_s
    return tuple(
        str(name)
        for name, separation in zip(const.name, const.df, strict=True)
        if separation >= least_separation_per_h and name != MEAN_NAME
    )


def solve_constants(
    time_s: FloatArray,
    level_m: FloatArray,
    constituents: Sequence[str],
    infer: Mapping[str, tuple[str, float, float]],
    latitude_deg: float,
) -> TideConstants:
    """Harmonic constants by ordinary least squares, nodal corrections exact at each sample, no trend.

    Parameters
    ----------
    time_s : (n,) array
        Seconds since 1970, finite and increasing; evenly spaced or not.
    level_m : (n,) array
        Levels [m above datum]; samples that are NaN are left out.
    constituents : sequence of str
        What to fit. Inferred ones and their references may stand in it or not.
    infer : mapping of str to (str, float, float)
        Inferred constituent: its reference, amplitude ratio, phase of the reference minus its own [degrees].
    latitude_deg : float
        Latitude, -90 to 90 [degrees].

    Returns
    -------
    TideConstants
        In the order of `constituents`, then references and inferred ones that are not among them; phases 0 to 360
        degrees, Greenwich.

    Raises
    ------
    FitError
        If a name is unknown or stands twice, there are fewer than four good samples an unknown, a number is infinite,
        the inference contradicts itself, or the library warns or fails.
    DomainError
        If times do not increase, shapes differ, or the latitude is out of range.

    References
    ----------
    Codiga, D. L. (2011), Unified tidal analysis and prediction using the UTide Matlab functions, GSO Technical Report
    2011-01, University of Rhode Island.
    """
    import utide

    usable_latitude_deg = _usable_latitude(latitude_deg)
    _check_series(time_s, level_m)
    names = fitted_names(constituents, infer)
    free = tuple(name for name in names if name not in infer)
    good = ~np.isnan(level_m)
    _check_enough(int(good.sum()), free)
    with _faults_of_the_library():
        # The library sorts its results and writes into `infer`: it gets its own copies, and results are read by name.
        # Good samples alone: it takes padding for record, and without intervals it gains nothing from an even grid.
        solution = utide.solve(
            datetime64_utc(time_s[good]),
            np.array(level_m[good], dtype=np.float64),
            lat=usable_latitude_deg,
            constit=list(names),
            infer=_library_inference(infer),
            conf_int="none",
            method="ols",
            trend=False,
            nodal=True,
            phase="Greenwich",
            order_constit="frequency",
            white=False,
            verbose=False,
            epoch=None,
        )
    place = {str(name): index for index, name in enumerate(solution.name)}
    order = [place[name] for name in names]
    amplitude_m = np.asarray(solution.A, dtype=np.float64)[order]
    phase_deg = np.asarray(solution.g, dtype=np.float64)[order] % 360.0
    mean_m = float(solution.mean)
    if not (np.all(np.isfinite(amplitude_m)) and np.all(np.isfinite(phase_deg)) and np.isfinite(mean_m)):
        raise FitError("the harmonic fit gave numbers that are not finite; look at the levels of the record")
    return TideConstants(
        constituents=names,
        amplitude_m=amplitude_m,
        phase_deg=phase_deg,
        mean_m=mean_m,
        latitude_deg=latitude_deg,
    )


def predicted_tide(constants: TideConstants, time_s: FloatArray) -> FloatArray:
    """Tide at any date, its mean not included, nodal corrections exact at each time.

    Parameters
    ----------
    constants : TideConstants
        Of a fit or a table; every one of them enters, however small.
    time_s : (n,) array
        Seconds since 1970, finite, in any order.

    Returns
    -------
    (n,) array
        Height of the tide above its mean [m]. Memory does not grow with n but for this array.

    Raises
    ------
    DomainError
        If a time is not finite.
    FitError
        If a constituent is unknown or the library warns or fails.
    """
    import utide

    times = np.asarray(time_s, dtype=np.float64)
    if times.ndim != 1 or not np.all(np.isfinite(times)):
        raise DomainError("times of a prediction must be one row of finite seconds since 1970")
    tide_m = np.zeros(times.size)
    if not constants.constituents:
        return tide_m
    coefficients = _library_coefficients(constants)
    for first in range(0, times.size, SAMPLES_PER_CHUNK):
        part = slice(first, first + SAMPLES_PER_CHUNK)
        with _faults_of_the_library():
            prediction = utide.reconstruct(
                datetime64_utc(times[part]),
                coefficients,
                epoch=None,
                verbose=False,
                constit=None,
                min_SNR=0,
                min_PE=0,
            )
        tide_m[part] = prediction.h
    return tide_m


def fitted_names(constituents: Sequence[str], infer: Mapping[str, tuple[str, float, float]]) -> tuple[str, ...]:
    """Return the names that a fit gives: the list, then references and inferred constituents that it lacks.

    Raises
    ------
    FitError
        If the list is empty, a name is unknown or stands twice, a reference is itself inferred, nothing is left that
        is neither inferred nor a reference, or a ratio is not positive and finite.
    """
    references = dict.fromkeys(reference for reference, _, _ in infer.values())
    names = tuple(dict.fromkeys((*constituents, *references, *infer)))
    _check_names((*constituents, *infer, *references))
    twice = sorted({name for name in constituents if list(constituents).count(name) > 1})
    if twice:
        raise FitError(f"tide.constituents: {', '.join(twice)} stands twice; name each constituent once")
    for name, (reference, ratio, offset_deg) in infer.items():
        if reference in infer:
            raise FitError(f"tide.infer.{name}: its reference {reference} is itself inferred; name a fitted one")
        if not (np.isfinite(ratio) and ratio > 0.0 and np.isfinite(offset_deg)):
            raise FitError(f"tide.infer.{name}: ratio {ratio} must be positive and phase {offset_deg} finite")
    if not set(names) - set(infer) - set(references):
        raise FitError("tide.constituents: name at least one constituent that is neither inferred nor a reference")
    return names


def _check_names(names: Sequence[str]) -> None:
    problems = dict.fromkeys(problem for name in names if (problem := name_problem(name)) is not None)
    if problems:
        raise FitError("; ".join(problems))


def _check_series(time_s: FloatArray, level_m: FloatArray) -> None:
    if time_s.ndim != 1 or time_s.shape != level_m.shape:
        raise DomainError("times and levels of a fit must be two rows of one length")
    if not np.all(np.isfinite(time_s)) or np.any(np.diff(time_s) <= 0.0):
        raise DomainError("times of a fit must be finite and increase, none twice")
    if np.any(np.isinf(level_m)):
        raise FitError("a level of the record is infinite; flag it as failed")


def _check_enough(samples: int, free: Sequence[str]) -> None:
    unknowns = 2 * len(free) + 1
    if samples < SAMPLES_PER_PARAMETER * unknowns:
        raise FitError(
            f"{samples} good samples for {unknowns} unknowns ({len(free)} constituents and the mean), at least "
            f"{SAMPLES_PER_PARAMETER * unknowns} are needed; give a longer record or a shorter tide.constituents"
        )


def _usable_latitude(latitude_deg: float) -> float:
    latitude_deg = float(latitude_deg)
    if not -90.0 <= latitude_deg <= 90.0:
        raise DomainError(f"site.latitude_deg: {latitude_deg} must lie within -90 to 90 degrees")
    return latitude_deg or SMALLEST_LATITUDE_DEG


def _library_inference(infer: Mapping[str, tuple[str, float, float]]) -> Any:
    """Return the inference in the one form that the library reads, or None."""
    import utide.utilities

    if not infer:
        return None
    return utide.utilities.Bunch(
        inferred_names=list(infer),
        reference_names=[reference for reference, _, _ in infer.values()],
        amp_ratios=[float(ratio) for _, ratio, _ in infer.values()],
        phase_offsets=[float(offset_deg) for _, _, offset_deg in infer.values()],
        approximate=False,
    )


def _library_coefficients(constants: TideConstants) -> Any:
    """Return what a prediction by the library needs, made from the constants alone."""
    import utide
    import utide.utilities

    bunch = utide.utilities.Bunch
    options = bunch(
        twodim=False,
        nodiagn=True,
        nodsatlint=False,
        nodsatnone=False,
        gwchlint=False,
        gwchnone=False,
        notrend=True,
        prefilt=[],
    )
    index = utide.constit_index_dict
    return bunch(
        name=np.array(constants.constituents, dtype=object),
        A=np.array(constants.amplitude_m),
        g=np.array(constants.phase_deg),
        mean=0.0,
        aux=bunch(
            frq=constituent_frequencies(constants.constituents),
            lind=np.array([index[name] for name in constants.constituents], dtype=int),
            reftime=0.0,
            lat=_usable_latitude(constants.latitude_deg),
            opt=options,
        ),
    )


@contextmanager
def _faults_of_the_library() -> Iterator[None]:
    """Turn a warning or a failure inside the library into a refusal: often a warning is the only trace of a fault."""
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("error")
            for notice in (DeprecationWarning, PendingDeprecationWarning, FutureWarning, ImportWarning):
                warnings.simplefilter("ignore", notice)
            yield
    except (Warning, ArithmeticError, AttributeError, LookupError, TypeError, ValueError) as fault:
        raise FitError(f"the tide library stopped: {type(fault).__name__}: {fault}") from fault
