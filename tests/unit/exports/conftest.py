"""The invented corridor, made once for all tests of the exports."""

from __future__ import annotations

import pytest

from geomap.results import Results
from tests.unit.exports.sample import sample_results


@pytest.fixture(scope="session")
def results() -> Results:
    """Return the invented corridor; its tables are never changed by a test."""
    return sample_results()
