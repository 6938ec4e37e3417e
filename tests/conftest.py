"""What all tests share: the figures of the accuracy table, and the reference data beside them."""

import pytest
from oracle.figures import Figures


@pytest.fixture(scope="session")
def figures():
    """Measured figures of this run; kept for the accuracy table when the run ends."""
    kept = Figures()
    yield kept
    if kept.rows:
        kept.save()
