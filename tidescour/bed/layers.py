"""What lies under the bed at one place: which layer is at its surface, and how deep the others begin."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

from tidescour.bed.history import place_name
from tidescour.errors import Finding
from tidescour.plan.models_bed import Bed, BedLayer, PlaceBed


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class BedLayers:
    """The layers of one place from the surface down.

    Parameters
    ----------
    top_depth_m : tuple of float
        Depth of each layer's top below the original bed [m], increasing; the first is 0.
    layers : tuple of BedLayer or None
        One a depth; None is the surface as `[bed]` or the place itself gives it.
    findings : tuple of Finding
        A note where a layer is taken as the surface.
    """

    top_depth_m: tuple[float, ...]
    layers: tuple[BedLayer | None, ...]
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        """Check that depths and layers go together."""
        if len(self.top_depth_m) != len(self.layers) or self.top_depth_m[:1] != (0.0,):
            raise ValueError("each layer must have one depth, the first 0")
        if any(below <= above for above, below in pairwise(self.top_depth_m)):
            raise ValueError("depths must increase")


def bed_layers(place: PlaceBed, bed: Bed) -> BedLayers:
    """Return the layers that a hole at one place meets.

    Parameters
    ----------
    place : PlaceBed
        Its original bed level, and whether it has a grain of its own.
    bed : Bed
        With the tops of the layers [m above the datum], no two the same.

    Returns
    -------
    BedLayers
        The surface is the lowest of the layers whose top is at or over the bed, unless the place gives its own
        `d50_mm`; those above it are not met. Then the layers below, from the top down.
    """
    level = place.bed_level_m
    downward = sorted(bed.layer, key=lambda layer: -layer.top_level_m)
    reached = [layer for layer in downward if layer.top_level_m >= level]
    below = [layer for layer in downward if layer.top_level_m < level]
    surface = reached[-1] if reached and not place.own_d50 else None
    return BedLayers(
        top_depth_m=(0.0, *(level - layer.top_level_m for layer in below)),
        layers=(surface, *below),
        findings=() if surface is None else (_surface_finding(place, surface),),
    )


def _surface_finding(place: PlaceBed, layer: BedLayer) -> Finding:
    return Finding(
        severity="note",
        code="layer-at-surface",
        where=place_name(place.opening, place.side),
        message=(
            f"the bed at {place.bed_level_m:g} m is not over the top of layer {layer.name!r} at {layer.top_level_m:g} "
            "m, which is taken as the surface here; d50_mm of this place would go before it"
        ),
    )
