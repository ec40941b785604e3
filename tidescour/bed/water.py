"""Density and viscosity of sea water at the bed, and the relative weight of a grain in it.

Salinity is given in g/kg and taken as practical salinity too: 0.5 % apart, 0.1 kg/m3 in density.
"""

from __future__ import annotations

from tidescour.errors import DomainError


def water_density(temperature_c: float, salinity_g_kg: float) -> float:
    """Density of sea water at one atmosphere.

    Parameters
    ----------
    temperature_c : float
        Temperature [degrees C], -2 to 40.
    salinity_g_kg : float
        Salinity [g/kg], 0 to 42.

    Returns
    -------
    float
        Density [kg/m3].

    Raises
    ------
    DomainError
        If either is outside its range or not a number.

    References
    ----------
    EOS-80: Fofonoff & Millard 1983, UNESCO Technical Papers in Marine Science 44, equations 13 and 14.
    """
    _check_range(temperature_c, salinity_g_kg)
    t, s = temperature_c, salinity_g_kg
    fresh = 999.842594 + t * (
        6.793952e-2 + t * (-9.095290e-3 + t * (1.001685e-4 + t * (-1.120083e-6 + t * 6.536332e-9)))
    )
    linear = 0.824493 + t * (-4.0899e-3 + t * (7.6438e-5 + t * (-8.2467e-7 + t * 5.3875e-9)))
    root = -5.72466e-3 + t * (1.0227e-4 - t * 1.6546e-6)
    return float(fresh + linear * s + root * s**1.5 + 4.8314e-4 * s**2)


def dynamic_viscosity(temperature_c: float, salinity_g_kg: float) -> float:
    """Dynamic viscosity of sea water.

    Parameters
    ----------
    temperature_c : float
        Temperature [degrees C], -2 to 40; the source begins at 0.
    salinity_g_kg : float
        Salinity [g/kg], 0 to 42.

    Returns
    -------
    float
        Dynamic viscosity [Pa s], within 1.5 %.

    Raises
    ------
    DomainError
        If either is outside its range or not a number.

    References
    ----------
    Sharqawy, Lienhard & Zubair 2010, Desalination and Water Treatment 16, equations 22 and 23 (from memory).
    """
    _check_range(temperature_c, salinity_g_kg)
    t, s = temperature_c, salinity_g_kg / 1000.0
    fresh = 4.2844e-5 + 1.0 / (0.157 * (t + 64.993) ** 2 - 91.296)
    linear = 1.541 + 1.998e-2 * t - 9.52e-5 * t**2
    square = 7.974 - 7.561e-2 * t + 4.724e-4 * t**2
    return fresh * (1.0 + linear * s + square * s**2)


def kinematic_viscosity(temperature_c: float, salinity_g_kg: float) -> float:
    """Kinematic viscosity of sea water [m2/s]; ranges and errors as `dynamic_viscosity`."""
    return dynamic_viscosity(temperature_c, salinity_g_kg) / water_density(temperature_c, salinity_g_kg)


def submerged_relative_density(temperature_c: float, salinity_g_kg: float, grain_density_kg_m3: float) -> float:
    """Relative density of a grain under water, rho_s / rho - 1.

    Parameters
    ----------
    temperature_c, salinity_g_kg : float
        As in `water_density`.
    grain_density_kg_m3 : float
        Density of the grain [kg/m3], above that of the water.

    Returns
    -------
    float
        Positive number, about 1.59 for quartz in sea water.

    Raises
    ------
    DomainError
        If the water is out of range, or the grain is not heavier than it.
    """
    relative = grain_density_kg_m3 / water_density(temperature_c, salinity_g_kg) - 1.0
    if not relative > 0.0:
        raise DomainError(f"a grain of {grain_density_kg_m3:g} kg/m3 floats: write bed.grain_density_kg_m3 near 2650")
    return relative


def _check_range(temperature_c: float, salinity_g_kg: float) -> None:
    if not -2.0 <= temperature_c <= 40.0:
        raise DomainError(f"water.temperature_c = {temperature_c:g} must be within -2 to 40")
    if not 0.0 <= salinity_g_kg <= 42.0:
        raise DomainError(f"water.salinity_g_kg = {salinity_g_kg:g} must be within 0 to 42")
