"""The basin's storage: volume by level and level by volume."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from tidescour.compiled import compiled
from tidescour.errors import DomainError
from tidescour.units import FloatArray, read_only


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Storage:
    """Wet area by level, linear between the levels given and constant outside them.

    Parameters
    ----------
    level_m : (n,) array
        Levels [m above datum], increasing.
    area_m2 : (n,) array
        Wet area at each [m2], positive.
    volume_m3 : (n,) array
        Volume above the lowest level [m3]; computed where it is not given.
    """

    level_m: FloatArray
    area_m2: FloatArray
    volume_m3: FloatArray

    def __post_init__(self) -> None:
        """Check shapes, order and sign; keep read-only copies."""
        for key in ("level_m", "area_m2", "volume_m3"):
            object.__setattr__(self, key, read_only(getattr(self, key)))
        if not self.level_m.shape == self.area_m2.shape == self.volume_m3.shape:
            raise DomainError("basin: level_m and area_m2 must have one length")
        if np.any(np.diff(self.level_m) <= 0.0) or not np.all(self.area_m2 > 0.0):
            raise DomainError("basin: levels must increase and areas must be positive")


def storage_from_area(level_m: FloatArray, area_m2: FloatArray) -> Storage:
    """Return the storage of a basin from its wet area [m2] by level [m above datum]."""
    level = np.asarray(level_m, dtype=np.float64)
    area = np.asarray(area_m2, dtype=np.float64)
    if level.shape != area.shape:
        raise DomainError("basin: level_m and area_m2 must have one length")
    slices = 0.5 * (area[1:] + area[:-1]) * np.diff(level)
    return Storage(level_m=level, area_m2=area, volume_m3=np.concatenate(([0.0], np.cumsum(slices))))


@compiled
def _node_below(value: float, nodes: FloatArray) -> int:
    """Return the last of increasing nodes that is not above a value between the first and the last."""
    low, high = 0, nodes.size - 1
    while high - low > 1:
        middle = (low + high) // 2
        if nodes[middle] <= value:
            low = middle
        else:
            high = middle
    return low


@compiled
def area_at(level_m: float, levels: FloatArray, areas: FloatArray) -> float:
    """Return the wet area [m2] at one level [m]."""
    last = levels.size - 1
    if level_m <= levels[0]:
        return float(areas[0])
    if level_m >= levels[last]:
        return float(areas[last])
    below = _node_below(level_m, levels)
    share = (level_m - levels[below]) / (levels[below + 1] - levels[below])
    return float(areas[below] + share * (areas[below + 1] - areas[below]))


@compiled
def volume_at(level_m: float, levels: FloatArray, areas: FloatArray, volumes: FloatArray) -> float:
    """Return the volume [m3] stored below one level [m], counted from the lowest level of the table."""
    last = levels.size - 1
    if level_m <= levels[0]:
        return float(volumes[0] + (level_m - levels[0]) * areas[0])
    if level_m >= levels[last]:
        return float(volumes[last] + (level_m - levels[last]) * areas[last])
    below = _node_below(level_m, levels)
    rise = level_m - levels[below]
    gradient = (areas[below + 1] - areas[below]) / (levels[below + 1] - levels[below])
    return float(volumes[below] + rise * (areas[below] + 0.5 * gradient * rise))


@compiled
def level_at(volume_m3: float, levels: FloatArray, areas: FloatArray, volumes: FloatArray) -> float:
    """Return the level [m] of one stored volume [m3]; the inverse of `volume_at`."""
    last = levels.size - 1
    if volume_m3 <= volumes[0]:
        return float(levels[0] + (volume_m3 - volumes[0]) / areas[0])
    if volume_m3 >= volumes[last]:
        return float(levels[last] + (volume_m3 - volumes[last]) / areas[last])
    below = _node_below(volume_m3, volumes)
    extra = volume_m3 - volumes[below]
    gradient = (areas[below + 1] - areas[below]) / (levels[below + 1] - levels[below])
    return float(levels[below] + 2.0 * extra / (areas[below] + math.sqrt(areas[below] ** 2 + 2.0 * gradient * extra)))


def stored_volumes(storage: Storage, level_m: FloatArray) -> FloatArray:
    """Return the volumes [m3] at an array of levels [m], shape kept."""
    volumes = np.empty(level_m.size)
    for position, level in enumerate(level_m.ravel()):
        volumes[position] = volume_at(level, storage.level_m, storage.area_m2, storage.volume_m3)
    return volumes.reshape(level_m.shape)
