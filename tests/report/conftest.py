import runpy
from pathlib import Path

import pytest

INVENTED = runpy.run_path(str(Path(__file__).parents[1] / "handoff" / "invented.py"))


@pytest.fixture(scope="session")
def results():
    """A small run with two stages and two openings; its numbers are invented."""
    return INVENTED["invented_results"]()


@pytest.fixture(scope="session")
def make_results():
    """Return the builder of invented runs."""
    return INVENTED["invented_results"]
