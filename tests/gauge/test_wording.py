"""Words that several messages share."""

import pytest

from tidescour.gauge.wording import counted


@pytest.mark.parametrize(("count", "text"), [(0, "0 rows"), (1, "1 row"), (2, "2 rows")])
def test_a_count_and_its_noun_agree(count, text):
    assert counted(count, "row") == text
