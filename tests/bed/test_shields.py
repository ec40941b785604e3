import numpy as np
import pytest

from tidescour.bed.shields import SHIELDS
from tidescour.errors import DomainError


@pytest.mark.parametrize("name", SHIELDS)
def test_curves_give_the_values_of_their_formulas(published, name):
    table = published("soulsby_1997_shields.csv")
    found = SHIELDS[name].function(table["grain_size"])
    np.testing.assert_allclose(found, table[name.replace("-", "_")], atol=5.1e-6)


@pytest.mark.parametrize("name", SHIELDS)
def test_entries_are_named_as_in_the_plan_and_pass_nan_on(name):
    entry = SHIELDS[name]
    assert entry.name == name
    found = entry.function(np.array([5.0, np.nan, 50.0]))
    assert np.isnan(found).tolist() == [False, True, False]


@pytest.mark.parametrize(("name", "outside"), [("soulsby", 0.1), ("van-rijn", 0.99), ("brownlie", 0.0)])
def test_curves_refuse_grains_outside_their_range(name, outside):
    with pytest.raises(DomainError, match=r"dimensionless grain size .* must be"):
        SHIELDS[name].function(np.array([5.0, outside]))
