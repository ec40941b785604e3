"""Parts of a programme: the rows of a place from one moment to another."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from tidescour.scour.records import HOUR_KEYS, CycleSet, EffectiveDuration, RowDurations
from tidescour.units import BoolArray, FloatArray


def rows_between(rows: Sequence[RowDurations], from_s: float, to_s: float) -> tuple[RowDurations, ...]:
    """Return the parts of rows between two moments.

    Parameters
    ----------
    rows : sequence of RowDurations
        Rows of one place in the order of the stages.
    from_s, to_s : float
        Moments, seconds since 1970.

    Returns
    -------
    tuple of RowDurations
        The hours of a cycle cut by one of the moments are in proportion to its time; rows outside are left out, so
        that there are none where `to_s` is not later.
    """
    return tuple(part for row in rows if (part := _part(row, from_s, to_s)) is not None)


def _part(row: RowDurations, from_s: float, to_s: float) -> RowDurations | None:
    start_s, end_s = np.maximum(row.cycles.start_s, from_s), np.minimum(row.cycles.end_s, to_s)
    inside = end_s > start_s
    if not np.any(inside):
        return None
    share = (end_s - start_s)[inside] / (row.cycles.end_s - row.cycles.start_s)[inside]
    cycles = CycleSet(start_s=start_s[inside], end_s=end_s[inside])
    return replace(row, layers=tuple(_layer_part(layer, cycles, inside, share) for layer in row.layers))


def _layer_part(layer: EffectiveDuration, cycles: CycleSet, inside: BoolArray, share: FloatArray) -> EffectiveDuration:
    return replace(layer, cycles=cycles, **{key: share * getattr(layer, key)[inside] for key in HOUR_KEYS})
