from hashlib import sha256

import pytest

from tidescour.errors import PlanError
from tidescour.plan.hashes import plan_hashes


def test_plan_and_programme_are_hashed_by_their_bytes(read, plan_text, tmp_path):
    table = (
        b"stage,start,end,opening,crest_level_m,width_m,relation,coefficient\r\n"
        b"one,2027-01-01T00:00:00Z,2027-02-01T00:00:00Z,shoal,-6,400,broad-crest,0.9\r\n"
    )
    (tmp_path / "tables").mkdir()
    (tmp_path / "tables" / "p.csv").write_bytes(table)
    text = plan_text[: plan_text.index("[[stage]]")] + '[programme]\nfile = "tables/p.csv"\n'
    assert plan_hashes(read(text)) == (
        ("plan.toml", sha256(text.encode()).hexdigest()),
        ("tables/p.csv", sha256(table).hexdigest()),
    )


def test_a_plan_that_went_away_is_refused(read, plan_text):
    plan = read(plan_text)
    plan.file.unlink()
    with pytest.raises(PlanError, match="cannot be read any more"):
        plan_hashes(plan)
