"""Size of the stone that a velocity asks for, by published stability forms side by side: for screening only."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from typing import Final

from scipy.optimize import brentq
from scipy.special import lambertw

from tidescour.bed.stone_records import StoneDemand
from tidescour.errors import DomainError
from tidescour.table import Entry, symbols
from tidescour.units import GRAVITY_M_S2

SCREENING_ONLY: Final = "screening only, not a design of the protection"

StabilityForm = Callable[[StoneDemand], float]

PILARCZYK_SHIELDS: Final = 0.035
"""Shields parameter of the Pilarczyk form for loose stone (from memory)."""

OWN_SHIELDS: Final[Mapping[str, float]] = {"shields": 0.03, "pilarczyk": PILARCZYK_SHIELDS}
"""Shields parameter of each form that has one where the plan gives none; at 0.03 stones hardly move (from memory)."""

_EMBEDDED: Final = 1.2
_EXPOSED: Final = 0.86
_CHEZY_PER_LOG: Final = 18.0 / math.log(10.0)
_DEPTH_OVER_SIZE_OF_NO_CHEZY: Final = 6.0


def shields_parameter(form: str, demand: StoneDemand) -> float:
    """Shields parameter that a form takes for a load: that of the demand, or the form's own in `OWN_SHIELDS`."""
    return OWN_SHIELDS[form] if demand.shields is None else demand.shields


def izbash_embedded(demand: StoneDemand) -> float:
    """Stone size after Izbash [m], for a stone that lies among others; NaN where velocity or density is.

    u = 1.2 sqrt(2 g Delta d): Izbash 1932, 1935 (from memory).
    """
    return _izbash(demand, _EMBEDDED)


def izbash_exposed(demand: StoneDemand) -> float:
    """Stone size after Izbash [m], for a stone on top of others; NaN where velocity or density is.

    u = 0.86 sqrt(2 g Delta d): Izbash 1932, 1935 (from memory).
    """
    return _izbash(demand, _EXPOSED)


def _izbash(demand: StoneDemand, coefficient: float) -> float:
    return (demand.velocity_m_s / coefficient) ** 2 / (2.0 * GRAVITY_M_S2 * demand.relative_density)


def shields_stone(demand: StoneDemand) -> float:
    """Stone size by the Shields parameter, with turbulence.

    Parameters
    ----------
    demand : StoneDemand
        Without a Shields parameter, 0.03 holds.

    Returns
    -------
    float
        D_n50 [m]; 0 without flow, NaN where a number that it needs is NaN.

    Raises
    ------
    DomainError
        If the water is too shallow: d C^2 falls again where d is over 6 h / e^2 = 0.81 h, and no size has as much
        as is asked for.

    References
    ----------
    d = K_T^2 u^2 / (psi Delta C^2), C = 18 log10(12 h / ks), ks = 2 d: Schiereck & Verhagen 2012, Introduction to bed,
    bank and shore protection, ch. 3 (from memory). With x = d / (6 h), x ln(x)^2 is known: the smaller root is
    x = exp(2 W), W the lower branch of Lambert's function at minus half the square root of it.
    """
    if demand.velocity_m_s == 0.0:
        return 0.0
    longest = _DEPTH_OVER_SIZE_OF_NO_CHEZY * demand.depth_m
    weight = shields_parameter("shields", demand) * demand.relative_density * longest
    half_root = 0.5 * demand.turbulence_factor * demand.velocity_m_s / (_CHEZY_PER_LOG * math.sqrt(weight))
    if half_root > 1.0 / math.e:
        raise DomainError(
            f"water of {demand.depth_m:.3g} m is too shallow at {demand.velocity_m_s:.3g} m/s with K_T = "
            f"{demand.turbulence_factor:.3g}: no stone under 0.81 of the depth holds, and the Chezy coefficient has no "
            "meaning over it; take Izbash's forms there"
        )
    return longest * math.exp(2.0 * float(lambertw(-half_root, -1).real))


def pilarczyk_stone(demand: StoneDemand) -> float:
    """Stone size after Pilarczyk, with turbulence, in a velocity profile that is not developed.

    Parameters
    ----------
    demand : StoneDemand
        Without a Shields parameter, 0.035 holds; k_t^2 is the square of the turbulence factor.

    Returns
    -------
    float
        D_n50 [m]; 0 without flow, NaN where a number is NaN.

    References
    ----------
    d = (phi / Delta) (0.035 / psi) k_h k_t^2 / k_sl u^2 / (2 g), k_h = (1 + h / d)^-0.2: Pilarczyk 1995; Rock Manual,
    2nd ed. 2007 (from memory). Solved as d^0.8 (d + h)^0.2 = d at k_h 1.
    """
    shields = shields_parameter("pilarczyk", demand)
    strength = demand.relative_density * (shields / PILARCZYK_SHIELDS) * demand.slope_factor
    velocity_head = (demand.turbulence_factor * demand.velocity_m_s) ** 2 / (2.0 * GRAVITY_M_S2)
    largest = demand.stability_factor / strength * velocity_head
    if largest == 0.0 or not math.isfinite(largest + demand.depth_m):
        return largest + 0.0 * demand.depth_m

    def excess(share: float) -> float:
        return float(share**0.8 * (share + demand.depth_m / largest) ** 0.2 - 1.0)

    return largest * float(brentq(excess, 0.0, 1.0, xtol=1e-15, rtol=1e-13))


_COMMON = (
    ("d", "m", "size of the stone"),
    ("u", "m/s", "velocity at the stone: at the crest that of the contracted jet"),
    ("g", "m/s2", "gravity"),
    ("Delta", "-", "density of the stone over that of the water, less 1"),
)
_DEPTH = ("h", "m", "water depth over the stone")
_IZBASH_RANGE = (
    "the size of one stone, loaded by the velocity near it, such as on a closure dam in water a few stones deep; no "
    "depth, turbulence or slope in it"
)
_IZBASH_SOURCE = "Izbash (1932), (1935) (from memory)"
_OF_ALL_FORMS = ("stone-screening", "stone-not-judged")
_SIZE_WORDS = "D_n50, the side of a cube of the median weight, 0.84 d50"

STABILITY: Final[Mapping[str, Entry[StabilityForm]]] = {
    entry.name: entry
    for entry in (
        Entry(
            name="izbash-embedded",
            title="Izbash, stone among others: size d of the stone",
            function=izbash_embedded,
            says="d = u^2 / (1.2^2 2 g Delta) = 0.694 u^2 / (2 g Delta)",
            symbols=symbols(*_COMMON),
            validity=_IZBASH_RANGE,
            source=_IZBASH_SOURCE,
            confidence="from memory",
            leads_to=_OF_ALL_FORMS,
        ),
        Entry(
            name="izbash-exposed",
            title="Izbash, stone on top of others: size d of the stone",
            function=izbash_exposed,
            says="d = u^2 / (0.86^2 2 g Delta) = 1.352 u^2 / (2 g Delta)",
            symbols=symbols(*_COMMON),
            validity=_IZBASH_RANGE,
            source=_IZBASH_SOURCE,
            confidence="from memory",
            leads_to=_OF_ALL_FORMS,
        ),
        Entry(
            name="shields",
            title=f"Shields with turbulence: {_SIZE_WORDS}",
            function=shields_stone,
            says="d = K_T^2 u^2 / (psi Delta C^2), C = 18 log10(12 h / ks), ks = 2 d",
            symbols=symbols(
                *(each for each in _COMMON if each[0] != "g"),
                ("K_T", "-", "turbulence factor (1 + 3 r0) / 1.3, 1.0 to 1.5 in most flows"),
                ("psi", "-", "Shields parameter that the stone may reach, 0.03 where the plan gives none"),
                ("C", "m^0.5/s", "Chezy coefficient of the stone"),
                ("ks", "m", "roughness of the stone"),
                _DEPTH,
            ),
            validity="developed flow, stone under a fifth of the depth (common practice, no source); no size where it "
            "would be over 0.81 h",
            source="Schiereck and Verhagen (2012), Introduction to bed, bank and shore protection, ch. 3 (from memory)",
            confidence="from memory",
            left_by=("stone-without-size", "shields-in-shallow-water"),
            leads_to=_OF_ALL_FORMS,
        ),
        Entry(
            name="pilarczyk",
            title=f"Pilarczyk: {_SIZE_WORDS}",
            function=pilarczyk_stone,
            says="d = (phi / Delta) (0.035 / psi) k_h k_t2 / k_sl u^2 / (2 g), k_h = (1 + h / d)^-0.2",
            symbols=symbols(
                *_COMMON,
                ("phi", "-", "stability factor: 0.75 continuous layer, 1.0 to 1.5 edges and transitions"),
                ("psi", "-", "Shields parameter that the stone may reach, 0.035 where the plan gives none"),
                ("k_h", "-", "factor of a profile that is not developed"),
                ("k_t2", "-", "turbulence K_T^2: 1 normal, 1.5 to 2 high, 3 to 4 jets"),
                ("k_sl", "-", "slope factor, 1 on a level bed"),
                _DEPTH,
            ),
            validity="loose stone under a fifth of the depth (common practice, no source); a profile that is not "
            "developed, as behind a sill",
            source="Pilarczyk (1995); Rock Manual, 2nd ed. (2007), CIRIA C683 (from memory)",
            confidence="from memory",
            left_by=("pilarczyk-in-shallow-water",),
            leads_to=_OF_ALL_FORMS,
        ),
    )
}
