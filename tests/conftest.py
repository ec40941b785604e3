"""Builders shared by all tests."""

from pathlib import Path

import numpy as np
import pytest

PUBLISHED = Path(__file__).parent / "published"


@pytest.fixture(scope="session")
def published():
    """Read a table of published values as a structured array."""

    def read(name):
        rows = [line for line in (PUBLISHED / name).read_text().splitlines() if not line.startswith("#")]
        return np.atleast_1d(np.genfromtxt(rows, delimiter=",", names=True))

    return read
