"""``ferrule sheet backup`` and ``restore``, as a user runs them."""

from __future__ import annotations


def test_a_copy_brings_back_what_was_amended_since(ferrule, small_catalog, tmp_path):
    sites = ferrule("site", "list", "--json").out
    copy = tmp_path / "copy.sqlite"
    assert ferrule("sheet", "backup", copy).status == 0
    assert ferrule("site", "add", "Later", "--low", "-5", "--high", "30").status == 0
    assert ferrule("site", "list", "--json").out != sites
    ran = ferrule("sheet", "restore", copy)
    assert ran.status == 0 and "is kept as" in ran.err
    assert ferrule("site", "list", "--json").out == sites


def test_a_copy_is_never_written_over_a_file(ferrule, small_catalog, tmp_path):
    taken = tmp_path / "taken.sqlite"
    taken.write_text("precious")
    ran = ferrule("sheet", "backup", taken)
    assert (ran.status, ran.out) == (2, "") and ran.err.count("\n") == 1
    assert taken.read_text() == "precious"


def test_what_is_no_copy_is_refused_and_the_catalog_stays(ferrule, small_catalog, tmp_path):
    wrong = tmp_path / "wrong.sqlite"
    wrong.write_text("no catalog")
    kept = small_catalog.read_bytes()
    for file in (wrong, tmp_path / "nowhere.sqlite"):
        ran = ferrule("sheet", "restore", file)
        assert (ran.status, ran.out) == (2, "") and ran.err.count("\n") == 1
    assert small_catalog.read_bytes() == kept


def test_a_backup_makes_no_folder(ferrule, small_catalog, tmp_path):
    ran = ferrule("sheet", "backup", tmp_path / "nowhere" / "b.sqlite")
    assert ran.status == 2 and "there is no folder" in ran.err and ran.err.count("\n") == 1
    assert not (tmp_path / "nowhere").exists()
