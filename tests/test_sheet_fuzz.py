"""Random and damaged files of datasheets: a record, or one line; never a traceback, never half a record."""

from __future__ import annotations

from hypothesis import HealthCheck, given, settings
from sheet_fuzz import check, files

from catalog.store import Catalog


@settings(max_examples=400, deadline=None, suppress_health_check=list(HealthCheck))
@given(files)
def test_files_are_taken_whole_or_refused_in_one_line(tmp_path_factory, file):
    folder = tmp_path_factory.mktemp("fuzz")
    with Catalog.open(folder / "c.sqlite", create=True) as catalog:
        check(folder, catalog, *file)
