"""The order of the steps: records, tides, flows, bed, scour. No step's arithmetic stands here."""

from tidescour.pipeline.calibrating import calibrate
from tidescour.pipeline.choices import method_entries, plan_choices
from tidescour.pipeline.inputs import Progress, TidalInputs, silent, tidal_inputs
from tidescour.pipeline.methods import run_methods
from tidescour.pipeline.running import run
from tidescour.pipeline.sounding import soundings

__all__ = [
    "Progress",
    "TidalInputs",
    "calibrate",
    "method_entries",
    "plan_choices",
    "run",
    "run_methods",
    "silent",
    "soundings",
    "tidal_inputs",
]
