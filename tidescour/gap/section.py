"""The wet section over a crest: trapezoids and surveyed profiles, and the level in its control section."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from tidescour.compiled import compiled
from tidescour.errors import DomainError
from tidescour.gap.layers import CONTENT, EXTENT, GROWTH, LEVEL, content_at, layer_of
from tidescour.units import GRAVITY_M_S2, FloatArray, read_only


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Section:
    """The section of an opening at one moment.

    Parameters
    ----------
    crest_level_m : float
        Level below which nothing passes [m above datum]: the crest, or the fill of a surveyed profile.
    layers : (n, 4) array
        Lower level [m above datum], area below it [m2], width just above it [m], its growth [m/m]; see
        `tidescour.gap.layers`. The lowest level is not above the crest.
    """

    crest_level_m: float
    layers: FloatArray

    def __post_init__(self) -> None:
        """Check shape, sign and crest; keep a read-only copy."""
        object.__setattr__(self, "layers", read_only(self.layers))
        if self.layers.ndim != 2 or self.layers.shape[1] != 4 or not np.all(self.layers[:, EXTENT] >= 0.0):
            raise DomainError("a section wants rows of level, area, width (not negative) and its growth")
        if self.crest_level_m < self.layers[0, LEVEL]:
            raise DomainError(
                f"crest {self.crest_level_m:g} m lies under the lowest point of the section, "
                f"{self.layers[0, LEVEL]:g} m"
            )


def trapezoid_section(crest_level_m: float, width_m: float, side_slope: float = 0.0) -> Section:
    """Return a section of a width at its crest [m] and two equal sides, horizontal per vertical.

    Raises
    ------
    DomainError
        If the width is not positive (a triangle has a width of a hair), or the slope is negative.
    """
    if not width_m > 0.0 or not side_slope >= 0.0:
        raise DomainError(f"width {width_m:g} m must be positive and side slope {side_slope:g} not negative")
    return Section(crest_level_m=crest_level_m, layers=np.array([[crest_level_m, 0.0, width_m, 2.0 * side_slope]]))


def profile_layers(distance_m: FloatArray, level_m: FloatArray) -> FloatArray:
    """Return the (n, 4) layers of a surveyed profile across the gap.

    Parameters
    ----------
    distance_m, level_m : (m,) array
        Points along the profile [m, not decreasing] and their levels [m above datum], straight between them. At both
        ends, and over its highest point, stand vertical walls.

    Raises
    ------
    DomainError
        If there are fewer than two points, a distance decreases, or the profile has no width.
    """
    distance, level = np.asarray(distance_m, dtype=np.float64), np.asarray(level_m, dtype=np.float64)
    if distance.shape != level.shape or distance.size < 2 or np.any(np.diff(distance) < 0.0):
        raise DomainError("a profile wants two points at least, with distances that do not decrease")
    low, high = np.minimum(level[1:], level[:-1]), np.maximum(level[1:], level[:-1])
    reach = np.diff(distance)
    nodes = np.unique(level)
    # Width under water of each piece of the profile, just above and just below each level.
    tall = np.where(high > low, high - low, 1.0)
    share = np.clip((nodes[:, None] - low) / tall, 0.0, 1.0)
    above = (np.where(high > low, share, nodes[:, None] >= low) * reach).sum(axis=1)
    below = (np.where(high > low, share, nodes[:, None] > low) * reach).sum(axis=1)
    rise = np.diff(nodes)
    area = np.concatenate(([0.0], np.cumsum(0.5 * (above[:-1] + below[1:]) * rise)))
    growth = np.append((below[1:] - above[:-1]) / rise, 0.0)
    if not above[-1] > 0.0:
        raise DomainError("the profile has no width")
    return read_only(np.column_stack((nodes, area, above, growth)))


@compiled
def crest_area(level_m: float, crest_level_m: float, layers: FloatArray) -> float:
    """Return the wet area over the crest [m2] below a level [m above datum]; 0 where that is not over the crest."""
    if level_m <= crest_level_m:
        return 0.0
    return content_at(level_m, layers) - content_at(crest_level_m, layers)


@compiled
def _largest_in_layer(energy_m: float, k: int, below_m2: float, layers: FloatArray) -> float:
    """Return the level in a layer's geometry at which area squared times what is left of the energy is largest.

    From 2 T (E - z) = A with width T and area A over the crest, a quadratic in the height over the layer's level; NaN
    where it has no root. It may lie outside the layer.
    """
    height = energy_m - layers[k, LEVEL]
    width, growth = layers[k, EXTENT], layers[k, GROWTH]
    constant = layers[k, CONTENT] - below_m2 - 2.0 * height * width
    linear = 3.0 * width - 2.0 * growth * height
    square = linear * linear - 10.0 * growth * constant
    if square < 0.0:
        return math.nan
    root = math.sqrt(square)
    if linear >= 0.0:
        total = linear + root
        return float(layers[k, LEVEL] + (-2.0 * constant / total if total > 0.0 else 0.0))
    return float(layers[k, LEVEL] + (root - linear) / (5.0 * growth))


@compiled
def control_level(energy_m: float, downstream_m: float, crest_level_m: float, layers: FloatArray) -> float:
    """Return the level in the control section [m above datum].

    The discharge for a level z there goes with A(z) sqrt(E - z); the water takes the level, not under the crest nor
    the downstream level, at which that is largest: critical where the flow is free, the downstream level where it is
    drowned. A section with berms may have two critical depths; the one that passes more is taken.

    Parameters
    ----------
    energy_m, downstream_m : float
        Energy level upstream and level downstream [m above datum].
    crest_level_m, layers : float, (n, 4) array
        The section.

    References
    ----------
    Encyclopaedia Britannica, 11th ed. (1910), Hydraulics, section 44; energy at its least for a given discharge, as in
    any open-channel text (Chow 1959, Open-Channel Hydraulics, ch. 3 and 4, from memory).
    """
    low = max(downstream_m, crest_level_m)
    if energy_m <= low:
        return low
    below = content_at(crest_level_m, layers)
    if layers.shape[0] == 1 or layers[1, LEVEL] >= energy_m:
        level = _largest_in_layer(energy_m, 0, below, layers)
        return max(low, level)
    best, best_level = -1.0, low
    for k in range(layer_of(low, LEVEL, layers), layers.shape[0]):
        start = max(low, layers[k, LEVEL])
        if start >= energy_m:
            break
        end = energy_m
        if k + 1 < layers.shape[0]:
            end = min(end, layers[k + 1, LEVEL])
        peak = _largest_in_layer(energy_m, k, below, layers)
        for level in (start, peak if start < peak < end else start, end):
            passes = (content_at(level, layers) - below) ** 2 * (energy_m - level)
            if passes > best:
                best, best_level = passes, level
    return best_level


@compiled
def energy_discharge(energy_m: float, level_m: float, area_m2: float) -> float:
    """Return the discharge [m3/s] of an area whose velocity head is what the level leaves of the energy."""
    return area_m2 * math.sqrt(2.0 * GRAVITY_M_S2 * max(energy_m - level_m, 0.0))


def strips_discharge(energy_m: float, distance_m: FloatArray, level_m: FloatArray, crest_level_m: float) -> float:
    """Return the free discharge [m3/s, coefficient 1] of a profile cut into vertical strips, each critical by itself.

    Parameters
    ----------
    energy_m : float
        Energy level [m above datum].
    distance_m, level_m : (n,) array
        The profile [m, m above datum].
    crest_level_m : float
        Level up to which the profile is filled [m above datum].

    Notes
    -----
    Never less than the section as one: 7.6 % more for a triangle, tens of per cent for a channel between berms. It is
    computed only to say by how much.

    References
    ----------
    The broad crest of each strip, 2/3 sqrt(2 g / 3) H^1.5, integrated over straight pieces.
    """
    depth = np.maximum(energy_m - np.maximum(level_m, crest_level_m), 0.0)
    # Pieces that cross the water or the fill are cut by sampling them finely.
    fine = np.linspace(0.0, 1.0, 65)
    start, end = depth[:-1, None], depth[1:, None]
    ground = level_m[:-1, None] + fine * np.diff(level_m)[:, None]
    sampled = np.maximum(energy_m - np.maximum(ground, crest_level_m), 0.0)
    sampled[:, 0], sampled[:, -1] = start[:, 0], end[:, 0]
    mean = np.trapezoid(sampled**1.5, fine, axis=1)
    return float((2.0 / 3.0) ** 1.5 * math.sqrt(GRAVITY_M_S2) * np.sum(mean * np.diff(distance_m)))
