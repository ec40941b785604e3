import pytest

from tidescour.bed.layers import BedLayers, bed_layers
from tidescour.plan.models_bed import Bed, BedLayer

SILT, CLAY, GRAVEL = (
    BedLayer(name=name, top_level_m=top, d50_mm=d50)
    for name, top, d50 in (("silt", -8.0, 0.1), ("clay", -10.0, 0.05), ("gravel", -14.5, 4.0))
)
LAYERED = Bed(d50_mm=0.25, layer=(SILT, CLAY, GRAVEL))


def test_a_bed_without_layers_is_its_surface_alone(place):
    found = bed_layers(place(), Bed(d50_mm=0.25))
    assert (found.top_depth_m, found.layers, found.findings) == ((0.0,), (None,), ())


@pytest.mark.parametrize(
    ("level", "depths", "layers"),
    [
        (-5.0, (0.0, 3.0, 5.0, 9.5), (None, SILT, CLAY, GRAVEL)),
        (-8.0, (0.0, 2.0, 6.5), (SILT, CLAY, GRAVEL)),
        (-9.5, (0.0, 0.5, 5.0), (SILT, CLAY, GRAVEL)),
        (-20.0, (0.0,), (GRAVEL,)),
    ],
)
def test_the_lowest_layer_at_or_over_the_bed_is_its_surface(place, level, depths, layers):
    found = bed_layers(place(bed_level_m=level, d50_mm=0.25), LAYERED)
    assert found.top_depth_m == depths
    assert found.layers == layers
    assert [f.code for f in found.findings] == ([] if layers[0] is None else ["layer-at-surface"])


def test_what_is_taken_as_the_surface_is_told(place):
    (finding,) = bed_layers(place(), LAYERED).findings
    assert (finding.severity, finding.where) == ("note", "opening 'main gap', basin side")
    assert "bed at -9.5 m is not over the top of layer 'silt' at -8 m" in finding.message


def test_a_grain_of_the_place_itself_is_its_surface(place):
    found = bed_layers(place(d50_mm=0.25, own_d50=True), LAYERED)
    assert (found.top_depth_m, found.layers, found.findings) == ((0.0, 0.5, 5.0), (None, CLAY, GRAVEL), ())


@pytest.mark.parametrize(
    ("depths", "layers", "message"),
    [
        ((0.0,), (None, SILT), "one depth"),
        ((1.0,), (None,), "the first 0"),
        ((), (), "the first 0"),
        ((0.0, 2.0, 2.0), (None, SILT, CLAY), "increase"),
    ],
)
def test_depths_that_are_none_are_refused(depths, layers, message):
    with pytest.raises(ValueError, match=message):
        BedLayers(top_depth_m=depths, layers=layers)
