"""The basin's storage: volume by level and level by volume."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tidescour.errors import DomainError
from tidescour.gap.layers import CONTENT, EXTENT, GROWTH, LEVEL, content_at, extent_at, layers_from_content
from tidescour.gap.layers import layers_from_extent as _layers_from_area
from tidescour.plan.models import Basin
from tidescour.units import FloatArray, read_only


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Storage:
    """Volume and wet area by level.

    Parameters
    ----------
    layers : (n, 4) array
        Lower level [m above datum], volume below it [m3], wet area just above it [m2], its growth [m2/m]; see
        `tidescour.gap.layers`.
    """

    layers: FloatArray

    def __post_init__(self) -> None:
        """Check shape and sign; keep a read-only copy."""
        object.__setattr__(self, "layers", read_only(self.layers))
        if self.layers.ndim != 2 or self.layers.shape[1] != 4:
            raise DomainError("storage wants rows of level, volume, area and its growth")
        if not np.all(self.layers[:, EXTENT] > 0.0):
            raise DomainError("basin: areas must be positive, and volumes must increase with the level")


def storage_from_area(level_m: FloatArray, area_m2: FloatArray) -> Storage:
    """Return the storage of a basin from its wet area [m2] by level [m above datum], linear between."""
    return Storage(layers=_layers_from_area(level_m, area_m2))


def storage_from_volume(level_m: FloatArray, volume_m3: FloatArray) -> Storage:
    """Return the storage of a basin from its volume [m3] by level [m above datum], linear between."""
    return Storage(layers=layers_from_content(level_m, volume_m3))


def basin_storage(basin: Basin) -> Storage:
    """Return the storage that a plan's basin describes, by area or by volume."""
    if basin.volume_m3:
        return storage_from_volume(np.array(basin.level_m), np.array(basin.volume_m3))
    return storage_from_area(np.array(basin.level_m), np.array(basin.area_m2))


def scaled_storage(storage: Storage, factor: float) -> Storage:
    """Return a storage whose areas and volumes are a factor times those of another."""
    scale = np.ones(4)
    scale[[CONTENT, EXTENT, GROWTH]] = factor
    return Storage(layers=storage.layers * scale)


def stored_volumes(storage: Storage, level_m: FloatArray) -> FloatArray:
    """Return the volumes [m3] at an array of levels [m above datum], shape kept."""
    return np.array([content_at(level, storage.layers) for level in level_m.ravel()]).reshape(level_m.shape)


def wet_areas(storage: Storage, level_m: FloatArray) -> FloatArray:
    """Return the wet areas [m2] at an array of levels [m above datum], shape kept."""
    return np.array([extent_at(level, storage.layers) for level in level_m.ravel()]).reshape(level_m.shape)


def largest_area(storage: Storage) -> float:
    """Return the largest wet area in the table [m2]."""
    reach = np.diff(storage.layers[:, LEVEL], append=storage.layers[-1, LEVEL])
    return float(np.max(storage.layers[:, EXTENT] + storage.layers[:, GROWTH] * reach))
