"""An invented stone size: no number here is a fact of any site, or the output of the program."""

from tidescour.bed.stone_records import StoneDemand, StoneLoad, StoneSize


def invented_size(*, size_m, **changes):
    """Return sizes in the order of the forms; `changes` are those of the load."""
    load = {
        "stage": "sill, high",
        "opening": "main gap",
        "direction": "ebb",
        "location": "crest",
        "time_s": 1.8e9,
        "velocity_m_s": 3.0,
        "head_m": 0.7,
        "unit_discharge_m2_s": 6.0,
        "depth_m": 2.0,
        "turbulence_factor": 1.25,
        "assumption": "invented",
    }
    demand = StoneDemand(
        velocity_m_s=3.0,
        depth_m=2.0,
        turbulence_factor=1.25,
        relative_density=1.6,
        shields=None,
        stability_factor=0.75,
        slope_factor=0.9,
    )
    return StoneSize(load=StoneLoad(**(load | changes)), demand=demand, size_m=size_m)
