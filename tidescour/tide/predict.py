"""Predicted levels at any date."""

from __future__ import annotations

from tidescour.tide.library import predicted_tide
from tidescour.tide.records import TideConstants
from tidescour.units import FloatArray


def predicted_level(
    constants: TideConstants, time_s: FloatArray, factor: float = 1.0, set_up_m: float = 0.0
) -> FloatArray:
    """Predicted level: mean + factor x tide + set-up.

    Parameters
    ----------
    constants : TideConstants
        Of a fit or a table.
    time_s : (n,) array
        Seconds since 1970, finite, in any order.
    factor : float
        Multiplies the tide about its mean, `tide.sea_factor` on the sea side.
    set_up_m : float
        Added to the level [m], `tide.set_up_m` on the sea side.

    Returns
    -------
    (n,) array
        Level above the site datum [m]. Weather is not in it.

    Raises
    ------
    DomainError
        If a time is not finite.
    """
    return constants.mean_m + factor * predicted_tide(constants, time_s) + set_up_m
