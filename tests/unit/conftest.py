"""The shipped tables worked out once, for every test that looks at numbers."""

from pathlib import Path

import pytest

from generator.dataset import load_dataset
from generator.metrics import Handbook, Settings, compute

ROOT = Path(__file__).resolve().parents[2]


@pytest.fixture(scope="session")
def handbook() -> Handbook:
    """The handbook of the shipped tables, with the settings' own defaults."""
    return compute(load_dataset(ROOT / "data"), Settings())
