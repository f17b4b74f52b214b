"""The scripts of data_template are no package; tests import them from their folder."""

import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]
sys.path.insert(0, str(ROOT / "data_template"))


@pytest.fixture(scope="session")
def root() -> Path:
    return ROOT
