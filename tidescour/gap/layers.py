"""Layers: what lies below a level, such as a section's area by its width or a basin's volume by its area.

A table of layers has a row a layer, from below: its lower level, the content below that level, the extent just above
it, and the growth of the extent with level inside the layer. The lowest layer goes on below its level with its extent
there, the highest goes on upwards without end. Rows whose level is infinite fill a table up and are never reached.
"""

from __future__ import annotations

import math

import numpy as np

from tidescour.compiled import compiled
from tidescour.errors import DomainError
from tidescour.units import FloatArray, read_only

LEVEL, CONTENT, EXTENT, GROWTH = range(4)


def layers_from_extent(level_m: FloatArray, extent: FloatArray) -> FloatArray:
    """Return (n, 4) layers of an extent that is linear between levels and constant above the last.

    Parameters
    ----------
    level_m : (n,) array
        Levels [m above datum], increasing.
    extent : (n,) array
        Width [m] or area [m2] at each.

    Raises
    ------
    DomainError
        If the shapes differ, or levels do not increase.
    """
    level, value = _increasing(level_m, extent)
    rise = np.diff(level)
    below = np.concatenate(([0.0], np.cumsum(0.5 * (value[1:] + value[:-1]) * rise)))
    return read_only(np.column_stack((level, below, value, np.append(np.diff(value) / rise, 0.0))))


def layers_from_content(level_m: FloatArray, content: FloatArray) -> FloatArray:
    """Return (n - 1, 4) layers of a content that is linear between levels; its extent is constant in each.

    Above the last level the extent of the highest layer goes on.

    Parameters
    ----------
    level_m : (n,) array
        Levels [m above datum], increasing, two at least.
    content : (n,) array
        Area [m2] or volume [m3] below each.

    Raises
    ------
    DomainError
        If the shapes differ, there are fewer than two levels, or they do not increase.
    """
    level, value = _increasing(level_m, content)
    if level.size < 2:
        raise DomainError("two levels at least make a layer")
    extent = np.diff(value) / np.diff(level)
    return read_only(np.column_stack((level[:-1], value[:-1], extent, np.zeros(extent.size))))


def _increasing(level_m: FloatArray, values: FloatArray) -> tuple[FloatArray, FloatArray]:
    level, value = np.asarray(level_m, dtype=np.float64), np.asarray(values, dtype=np.float64)
    if level.shape != value.shape or level.ndim != 1 or level.size == 0:
        raise DomainError("levels and values must be two rows of one length")
    if np.any(np.diff(level) <= 0.0):
        raise DomainError("levels must increase")
    return level, value


@compiled
def layer_of(value: float, column: int, layers: FloatArray) -> int:
    """Return the highest layer whose level or content is not above a value; the lowest where there is none."""
    low, high = 0, layers.shape[0]
    while high - low > 1:
        middle = (low + high) // 2
        if layers[middle, column] <= value:
            low = middle
        else:
            high = middle
    return low


@compiled
def content_at(level_m: float, layers: FloatArray) -> float:
    """Return the content below one level [m above datum]; negative below the lowest level if that holds nothing."""
    k = layer_of(level_m, LEVEL, layers)
    rise = level_m - layers[k, LEVEL]
    growth = layers[k, GROWTH] if rise > 0.0 else 0.0
    return float(layers[k, CONTENT] + rise * (layers[k, EXTENT] + 0.5 * growth * rise))


@compiled
def extent_at(level_m: float, layers: FloatArray) -> float:
    """Return the extent at one level [m above datum]."""
    k = layer_of(level_m, LEVEL, layers)
    return float(layers[k, EXTENT] + layers[k, GROWTH] * max(level_m - layers[k, LEVEL], 0.0))


@compiled
def level_of(content: float, layers: FloatArray) -> float:
    """Return the level [m above datum] of one content, where the extent is positive; the inverse of `content_at`."""
    k = layer_of(content, CONTENT, layers)
    more = content - layers[k, CONTENT]
    extent = layers[k, EXTENT]
    growth = layers[k, GROWTH] if more > 0.0 else 0.0
    return float(layers[k, LEVEL] + 2.0 * more / (extent + math.sqrt(extent * extent + 2.0 * growth * more)))
