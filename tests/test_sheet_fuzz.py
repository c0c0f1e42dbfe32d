"""Random and damaged files of datasheets: a record, or one line; never a traceback, never half a record."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from sheet_fuzz import check, files

from catalog.store import Catalog


@pytest.fixture(scope="module")
def blank(tmp_path_factory) -> Path:
    """A catalog with nothing in it: one of its own for each example would take longer than the example."""
    path = tmp_path_factory.mktemp("blank") / "c.sqlite"
    with Catalog.open(path, create=True):
        return path


@settings(max_examples=400, deadline=None, suppress_health_check=list(HealthCheck))
@given(files)
def test_files_are_taken_whole_or_refused_with_a_line_per_fault(tmp_path_factory, blank, file):
    folder = tmp_path_factory.mktemp("fuzz")
    with Catalog.open(shutil.copy(blank, folder)) as catalog:
        check(folder, catalog, *file)
