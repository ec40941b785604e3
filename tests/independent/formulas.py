"""Published formulas, each with its source, for the recomputation beside this file."""

import math
from dataclasses import dataclass
from typing import Any

import numpy as np

G = 9.81
Array = np.ndarray


@dataclass(frozen=True)
class Law:
    """h = c E^q h0^r t^gamma, t in hours."""

    c: float
    q: float
    r: float
    gamma: float


def density(t: float, s: float) -> float:
    """EOS-80 at one atmosphere, UNESCO Technical Papers in Marine Science 44 (1983), eqs 13-14 [kg/m3]."""
    fresh = np.polyval([6.536332e-9, -1.120083e-6, 1.001685e-4, -9.095290e-3, 6.793952e-2, 999.842594], t)
    a = np.polyval([5.3875e-9, -8.2467e-7, 7.6438e-5, -4.0899e-3, 0.824493], t)
    b = np.polyval([-1.6546e-6, 1.0227e-4, -5.72466e-3], t)
    return float(fresh + a * s + b * s**1.5 + 4.8314e-4 * s**2)


def viscosity(t: float, s: float) -> float:
    """Kinematic viscosity, Sharqawy et al. 2010, eqs 22-23, with s in g/kg [m2/s]."""
    k = s / 1000.0
    fresh = 4.2844e-5 + 1.0 / (0.157 * (t + 64.993) ** 2 - 91.296)
    a = 1.541 + 1.998e-2 * t - 9.52e-5 * t**2
    b = 7.974 - 7.561e-2 * t + 4.724e-4 * t**2
    return fresh * (1.0 + a * k + b * k**2) / density(t, s)


def critical_velocity(d50_m: float, delta: float, nu: float, depth_m: float, ks_per_d50: float, form: str) -> float:
    """Shields form (Soulsby 1997 eq. 77 or Brownlie 1981), then Chezy with 18 log10(12 h / ks) [m/s]."""
    d_star = d50_m * (G * delta / nu**2) ** (1.0 / 3.0)
    reynolds = d_star**1.5
    theta = {
        "soulsby": 0.30 / (1.0 + 1.2 * d_star) + 0.055 * (1.0 - math.exp(-0.020 * d_star)),
        "brownlie": 0.22 * reynolds**-0.6 + 0.06 * 10.0 ** (-7.7 * reynolds**-0.6),
    }[form]
    chezy = 18.0 * math.log10(12.0 * depth_m / (ks_per_d50 * d50_m))
    return chezy / math.sqrt(G) * math.sqrt(theta * G * delta * d50_m)


def growth_law(name: str, delta: float) -> Law:
    """Breusers' law: with rounded exponents (explicit) or from the time scale with K = 330 and gamma = 0.4."""
    if name == "explicit":
        return Law(1.0 / (10.0 * delta**0.7), 1.7, 0.2, 0.4)
    return Law((330.0 * delta**1.7) ** -0.4, 4.3 * 0.4, 1.0 - 2.0 * 0.4, 0.4)


def alpha_formula(sill_m: Array | float, depth_m: float, length_m: float, chezy: float) -> Any:
    """Hoffmans and Verheij 1997 (from memory): 1.5 + 5 r0 f_C."""
    mixing = 0.0225 * (1.0 - sill_m / depth_m) ** -2 * ((length_m - 6.0 * sill_m) / (6.67 * depth_m) + 1.0) ** -1.08
    return 1.5 + 5.0 * np.sqrt(mixing + 1.45 * G / chezy**2) * max(1.0, chezy / 40.0)


def control_depth(up_m: float, down_m: float, width_m: float, slope: float) -> float:
    """max(h2, critical depth): y + A / (2 T) = h1 of a trapezoid is a quadratic in y."""
    if slope == 0.0:
        return max(down_m, up_m / 1.5)
    half = 3.0 * width_m - 4.0 * slope * up_m
    return max(down_m, (-half + math.sqrt(half**2 + 40.0 * slope * width_m * up_m)) / (10.0 * slope))


def crest_flow(sea_m: float, basin_m: float, section: tuple[float, float, float, float]) -> tuple[float, float, float]:
    """Discharge, wet area and mean width A / y of a crest (level, width, side slope, coefficient)."""
    crest_m, width_m, slope, coefficient = section
    up_m, down_m = max(sea_m, basin_m) - crest_m, min(sea_m, basin_m) - crest_m
    if up_m <= 0.0:
        return 0.0, 0.0, width_m
    y = control_depth(up_m, down_m, width_m, slope)
    area = (width_m + slope * y) * y
    discharge = coefficient * area * math.sqrt(2.0 * G * max(up_m - y, 0.0))
    return math.copysign(discharge, sea_m - basin_m), area, width_m + slope * y


def given_flow(
    discharge: float, sea_m: float, basin_m: float, section: tuple[float, ...]
) -> tuple[float, float, float]:
    """The same for a given discharge: critical depth of the side it comes from, even against the head."""
    crest_m, width_m, slope, _ = section
    up_m, down_m = (sea_m, basin_m) if discharge >= 0.0 else (basin_m, sea_m)
    if up_m <= crest_m:
        return discharge, 0.0, width_m
    y = control_depth(up_m - crest_m, down_m - crest_m, width_m, slope)
    return discharge, (width_m + slope * y) * y, width_m + slope * y
