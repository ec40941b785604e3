"""How wide the flow is at the end of the protection: the table of ways in which it spreads on its way there."""

from __future__ import annotations

from collections.abc import Callable
from typing import Final

import numpy as np

from tidescour.table import Entry, symbols
from tidescour.units import FloatArray

Spreading = Callable[[FloatArray, float, float], FloatArray]

CENTRE_LINE: Final = 3.5
"""Constant of a plane jet: u_m / u_0 = 3.5 / sqrt(2 x / B) (Rajaratnam 1976, from memory)."""

USUAL_WIDENING: Final = 0.125
"""Widening of 1 in 8 per side, the most of what is in use (common practice, from memory)."""


def unspread_width(flow_width_m: FloatArray, length_m: float, widening: float) -> FloatArray:
    """Width of a flow that does not spread [m]: that of the gap; `length_m` and `widening` do not matter."""
    return flow_width_m


def fixed_rate_width(flow_width_m: FloatArray, length_m: float, widening: float) -> FloatArray:
    """Width of a flow that spreads at a fixed rate, with the same velocity all over it.

    Parameters
    ----------
    flow_width_m : (n,) array
        Width of the flow in the gap [m], not negative.
    length_m : float
        Length of the protection [m], not negative.
    widening : float
        Metres on either side per metre of length, not negative.

    Returns
    -------
    (n,) array
        B + 2 widening L [m]; NaN where the width is.

    References
    ----------
    Widening of 1 in 8 to 1 in 10: common practice (from memory).
    """
    return flow_width_m + 2.0 * widening * length_m


def plane_jet_width(flow_width_m: FloatArray, length_m: float, widening: float) -> FloatArray:
    """Width over which the discharge would have the velocity of a plane jet's centre line.

    Parameters
    ----------
    flow_width_m : (n,) array
        Width B of the flow in the gap [m], not negative.
    length_m : float
        Length of the protection [m], not negative.
    widening : float
        Does not matter.

    Returns
    -------
    (n,) array
        B over u_m / u_0 [m]: B itself over a core of 6.1 widths, then sqrt(2 B L) / 3.5; NaN where the width is.

    References
    ----------
    u_m / u_0 = 3.5 / sqrt(2 x / B) behind the core, Rajaratnam 1976, Turbulent Jets (from memory).
    """
    return np.maximum(flow_width_m, np.sqrt(2.0 * flow_width_m * length_m) / CENTRE_LINE)


SPREADINGS: Final[dict[str, Entry[Spreading]]] = {
    "none": Entry(
        name="none",
        title="No spreading: the gap's discharge per metre of width reaches the end of the protection",
        function=unspread_width,
        says="W = B",
        symbols=symbols(
            ("W", "m", "width that carries the flow at the end of the protection"),
            ("B", "m", "mean width of the flow in the gap"),
        ),
        validity="any length; the cautious one, for the centre of a jet keeps its velocity over about six widths",
        source="continuity",
        confidence="derived",
        leads_to=("spreading-compared",),
    ),
    "fixed-rate": Entry(
        name="fixed-rate",
        title="Spreading at a fixed rate",
        function=fixed_rate_width,
        says="W = B + 2 w L",
        symbols=symbols(
            ("W", "m", "width that carries the flow at the end of the protection"),
            ("B", "m", "mean width of the flow in the gap"),
            ("w", "-", "widening, on either side and for each metre of length"),
            ("L", "m", "length of the protection"),
        ),
        validity="not cautious for the deepest point: a mean over the whole width, while the centre keeps its velocity "
        "over about six widths; widening 0.1 to 0.125 per side is in use, no wider than the channel",
        source="common closure practice (from memory)",
        confidence="common practice",
        left_by=("spreading-lowers-velocity",),
        leads_to=("spreading-compared",),
    ),
    "plane-jet": Entry(
        name="plane-jet",
        title="Centre line of a plane jet",
        function=plane_jet_width,
        says="W = B / s, s = u_m / u_0 = 3.5 / sqrt(2 L / B), at most 1",
        symbols=symbols(
            ("W", "m", "width that carries the flow at the end of the protection"),
            ("B", "m", "mean width of the flow in the gap"),
            ("s", "-", "velocity that is left"),
            ("u_m", "m/s", "velocity on the centre line at L"),
            ("u_0", "m/s", "velocity of the jet where it begins"),
            ("L", "m", "length of the protection"),
        ),
        validity="between the two: full velocity up to 6.1 widths; not cautious beyond where banks, a shallow bed or a "
        "neighbouring opening keep still water from mixing in",
        source="Rajaratnam (1976), Turbulent Jets (from memory)",
        confidence="from memory",
        left_by=("spreading-lowers-velocity",),
        leads_to=("spreading-compared",),
    ),
}


def spread_width(spreading: str, flow_width_m: FloatArray, length_m: float, widening: float) -> FloatArray:
    """Width that carries the flow at the end of the protection [m], by a name in `SPREADINGS`."""
    return SPREADINGS[spreading].function(flow_width_m, length_m, widening)


def velocity_share(spreading: str, flow_width_m: FloatArray, length_m: float, widening: float) -> FloatArray:
    """Velocity at the end of the protection over what it would be without spreading.

    Parameters
    ----------
    spreading : str
        Name in `SPREADINGS`.
    flow_width_m : (n,) array
        Width of the flow in the gap [m], positive.
    length_m, widening : float
        Length of the protection [m] and widening per side, not negative.

    Returns
    -------
    (n,) array
        Share over 0 and at most 1; it never rises with the length. NaN where the width is.

    References
    ----------
    Continuity: the inverse of the widths.
    """
    return flow_width_m / spread_width(spreading, flow_width_m, length_m, widening)
