"""The order of the steps: records, tides, flows, bed, scour. No step's arithmetic stands here."""

from tidescour.pipeline.calibrating import calibrate
from tidescour.pipeline.choices import method_entries, plan_choices
from tidescour.pipeline.inputs import Progress, TidalInputs, silent, tidal_inputs
from tidescour.pipeline.running import run

__all__ = ["Progress", "TidalInputs", "calibrate", "method_entries", "plan_choices", "run", "silent", "tidal_inputs"]
