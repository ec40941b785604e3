"""One stage at one place, as the steps of `bed_history` share it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.plan.models_bed import PlaceBed
from tidescour.units import BoolArray, FloatArray


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Row:
    """What runs over the protection of one place in one stage.

    Parameters
    ----------
    where : str
        Stage, opening and side, for messages.
    flow, opening, place : StageFlow, OpeningFlow, PlaceBed
        Water, opening and protection.
    length_m : float
        Length of the protection that is looked at [m].
    searching : bool
        The length is one of the search for the required length, not the plan's own.
    depth_m, width_m, sill_m : (n,) array
        Depth and width of the flow at the end of the protection, height of the crest over the bed there [m].
    flowing : (n,) bool array
        Covered samples with flow towards this side.
    """

    where: str
    flow: StageFlow
    opening: OpeningFlow
    place: PlaceBed
    length_m: float
    searching: bool
    depth_m: FloatArray
    width_m: FloatArray
    sill_m: FloatArray
    flowing: BoolArray

    @property
    def has_flow(self) -> bool:
        """Whether anything flows towards this side."""
        return bool(np.any(self.flowing))
