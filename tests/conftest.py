"""Fixtures that several test files share."""

from __future__ import annotations

from pathlib import Path

import pandas as pd
import pvlib
import pytest


@pytest.fixture(scope="session")
def cec_modules_path() -> Path:
    """The CEC module table in pvlib's data folder."""
    return _cec_path("modules")


@pytest.fixture(scope="session")
def cec_inverters_path() -> Path:
    """The CEC inverter table in pvlib's data folder."""
    return _cec_path("inverters")


@pytest.fixture(scope="session")
def cec_modules_csv(cec_modules_path: Path) -> pd.DataFrame:
    """The CEC module table as pandas reads it; rows 2 and 3 are units and variable names."""
    return pd.read_csv(cec_modules_path, skiprows=[1, 2])


@pytest.fixture(scope="session")
def cec_inverters_csv(cec_inverters_path: Path) -> pd.DataFrame:
    """The CEC inverter table as pandas reads it."""
    return pd.read_csv(cec_inverters_path, skiprows=[1, 2])


def _cec_path(kind: str) -> Path:
    return max((Path(pvlib.__file__).parent / "data").glob(f"sam-library-cec-{kind}-*.csv"))
