import runpy
from dataclasses import replace
from pathlib import Path

import pytest

from tidescour.bed.layers import BedLayers
from tidescour.plan.models_bed import BedLayer
from tidescour.scour.records import LayerReached

INVENTED = runpy.run_path(str(Path(__file__).with_name("invented.py")))


@pytest.fixture(scope="session")
def results():
    """A small run with two stages and two openings; its numbers are invented."""
    return INVENTED["invented_results"]()


@pytest.fixture(scope="session")
def layered(results):
    """The same with a clay that the hole of the first place reaches in the second stage."""
    place = results.places[0]
    row = place.rows[1]
    reached = LayerReached(
        layer=1, depth_m=2.5, time_s=1807000000.0, equivalent_start_h=30.0, effective_duration_h=12.0
    )
    steps = [replace(step, reached=(reached,)) for step in row.chain]
    layers = BedLayers(top_depth_m=(0.0, 2.5), layers=(None, BedLayer(name="clay", top_level_m=-11.5, d50_mm=0.01)))
    lower = replace(row.duration, critical_velocity_m_s=1.5 * row.duration.critical_velocity_m_s)
    durations = replace(row.durations, layers=(row.duration, lower), top_depth_m=(0.0, 2.5))
    grown = replace(row, chain=tuple(steps), durations=durations)
    changed = replace(place, layers=layers, rows=(place.rows[0], grown))
    return replace(results, places=(changed, *results.places[1:]))


@pytest.fixture(scope="session")
def make_results():
    """Return the builder of invented runs."""
    return INVENTED["invented_results"]
