"""The command as a whole: help, start-up, refusals, catalogs that cannot be used."""

from __future__ import annotations

import ctypes
import importlib.metadata
import io
import os
import re
import shlex
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import pytest
from catalog_records import MODULES

from catalog.store import Catalog
from cli.main import command as whole

ROOT = Path(__file__).parents[1]
HEAVY = ("pvlib", "pandas", "scipy", "sqlmodel", "sqlalchemy", "numpy", "rapidfuzz")


def in_a_shell(
    *arguments: object, python: tuple[str, ...] = (), **options
) -> subprocess.CompletedProcess[str]:
    """Run the command in a process of its own."""
    command = [sys.executable, *python, "-m", "cli", *map(str, arguments)]
    return subprocess.run(command, capture_output=True, text=True, cwd=ROOT, timeout=120, **options)


def leaves(command=None, path: tuple[str, ...] = ()) -> Iterator[tuple[tuple[str, ...], object]]:
    """Every command with its words."""
    command = command or whole()
    for name, sub in getattr(command, "commands", {}).items():
        yield from leaves(sub, (*path, name))
    if not hasattr(command, "commands"):
        yield path, command


LEAVES = dict(leaves())


def imported(importtime: str) -> set[str]:
    """Top-level packages in what ``python -X importtime`` tells."""
    return {m[1] for m in re.finditer(r"\|\s+([\w]+)\S*$", importtime, re.MULTILINE)}


def test_help_names_the_commands_and_imports_nothing_heavy():
    ran = in_a_shell("--help", python=("-X", "importtime"))
    assert ran.returncode == 0
    assert all(command in ran.stdout for command in ("fit", "sheet", "site", "demo"))
    assert imported(ran.stderr).isdisjoint(HEAVY)
    assert "typer" in imported(ran.stderr), "the list of imports was not understood"


def test_help_keeps_units_and_examples_whole(ferrule):
    out = ferrule("site", "add", "--help").out
    assert "Design low ambient temperature [degC]" in out
    assert "Example: ferrule site add Wharf --low -12 --high 36 --lat 52.1 --lon 4.3\n" in out


def test_finding_a_record_waits_for_no_table_library(small_catalog):
    ran = in_a_shell("sheet", "find", "af6k", "--catalog", small_catalog, python=("-X", "importtime"))
    assert "AF6K-270P" in ran.stdout
    assert imported(ran.stderr).isdisjoint({"pvlib", "pandas", "scipy", "sqlmodel", "sqlalchemy"})


def groups(command=None, path: tuple[str, ...] = ()) -> Iterator[tuple[str, ...]]:
    """Every group with its words, the command itself first."""
    command = command or whole()
    if hasattr(command, "commands"):
        yield path
        for name, sub in command.commands.items():
            yield from groups(sub, (*path, name))


GROUPS = list(groups())
GROUP_IDS = [" ".join(("ferrule", *path)) for path in GROUPS]


@pytest.mark.parametrize("words", GROUPS, ids=GROUP_IDS)
def test_a_group_alone_prints_its_help_and_is_bad_input(ferrule, words):
    asked = ferrule(*words, "--help")
    assert (asked.status, asked.err) == (0, "")
    assert ferrule(*words) == (2, "", asked.out)


@pytest.mark.parametrize("words", [*GROUPS, *LEAVES], ids=" ".join)
def test_a_help_fits_100_columns_and_nothing_in_it_is_cut(ferrule, monkeypatch, words):
    monkeypatch.setenv("COLUMNS", "100")
    out = ferrule(*words, "--help").out
    assert max(map(len, out.splitlines())) <= 100
    # What may be repeated has its dots behind a bracket, or in the line of usage.
    assert not re.search(r"^(?!Usage).*\w\.\.\.$", out, re.MULTILINE)
    assert not re.search(r"<\w|{|\[\[|\]\.\.\.$", out.replace("[ARGS]...", ""), re.MULTILINE)


def test_the_help_begins_with_the_first_steps(ferrule):
    out = ferrule("--help").out
    steps = re.findall(r"^    (ferrule .+?)(?:   .*)?$", out, re.MULTILINE)
    assert [step.split()[1] for step in steps] == ["demo", "sheet", "fit"]
    for step in steps:
        words = shlex.split(step)[1:]
        path = next(path for path in LEAVES if tuple(words[: len(path)]) == path)
        LEAVES[path].make_context(" ".join(path), words[len(path) :])
    # The README runs the last one, with the tables that the one before loads.
    name = shlex.split(steps[-1])[3]
    assert f'-m "{name}"' in (ROOT / "README.md").read_text(encoding="utf-8")


def test_the_version_is_that_of_the_installed_package(ferrule, monkeypatch):
    monkeypatch.setattr(importlib.metadata, "version", {"ferrule": "9.8.7"}.__getitem__)
    assert ferrule("--version") == (0, "ferrule 9.8.7\n", "")


def completed(ferrule, capsys, monkeypatch, typed: str) -> list[str]:
    """What a shell is offered for the last word."""
    monkeypatch.setenv("_FERRULE_COMPLETE", "complete_bash")
    monkeypatch.setenv("COMP_WORDS", typed)
    monkeypatch.setenv("COMP_CWORD", str(typed.count(" ")))
    with pytest.raises(SystemExit, match="0"):
        ferrule()
    return capsys.readouterr().out.split()


@pytest.mark.parametrize(
    ("typed", "offered"),
    [("ferrule sh", ["sheet"]), ("ferrule sheet am", ["amend"]), ("ferrule fit --mod", ["--module", "--module-price"])],
)
def test_a_shell_completes_commands_and_options(ferrule, capsys, monkeypatch, typed, offered):
    assert completed(ferrule, capsys, monkeypatch, typed) == offered


def example(words: tuple[str, ...]) -> list[str]:
    """The example of a command's help, as words, without the leading ``ferrule``."""
    found = re.search(r"Example: ferrule (.+?)(?:\n\n|\Z)", LEAVES[words].help or "", re.DOTALL)
    assert found, "the help has no line 'Example: ferrule ...'"
    return shlex.split(found[1])


#: Examples that are run where their outcome is looked at: in the README, and in tests/test_sheet_entering.py.
RUN_ELSEWHERE = {("demo",), ("sheet", "load"), ("sheet", "enter")}
#: What has to be done before an example can be run.
BEFORE = {("sheet", "undo"): ("sheet", "amend"), ("sheet", "restore"): ("sheet", "backup"), ("site", "drop"): ("site", "add")}


@pytest.mark.parametrize("words", LEAVES, ids=" ".join)
def test_every_command_has_a_help_with_an_example_that_can_be_pasted(
    ferrule, demo_catalog, tmp_path, monkeypatch, words
):
    """In a clone, on the catalog of the demo."""
    typed = example(words)
    assert tuple(typed[: len(words)]) == words
    LEAVES[words].make_context(" ".join(words), typed[len(words) :])
    if words in RUN_ELSEWHERE:
        return
    monkeypatch.chdir(tmp_path)
    (tmp_path / "seed_catalog").symlink_to(ROOT / "seed_catalog")
    if words in BEFORE:
        assert ferrule(*example(BEFORE[words])).status == 0
    ran = ferrule(*typed)
    assert ran.status == 0, ran.err


@pytest.mark.parametrize(
    ("typed", "near"),
    [
        (("sit", "list"), "site"),
        (("sheet", "lod"), "load"),
        (("fitt",), "fit"),
        (("sheet", "find", "x", "--lmit", "3"), "--limit"),
        (("fit", "--modul", "x"), "--module"),
        (("load", "cec"), "'ferrule sheet load' or 'ferrule stock load'"),
        (("sheet", "fit"), "'ferrule fit'"),
    ],
)
def test_an_unknown_word_names_the_near_one(ferrule, typed, near):
    ran = ferrule(*typed)
    assert ran.status == 2
    assert near in ran.err
    assert ran.err.startswith("ferrule: ") and ran.err.count("\n") == 1
    assert not ran.out


@pytest.mark.parametrize(
    "typed", [("sheet", "show"), ("site", "add"), ("sheet", "find", "x", "--limit", "0")]
)
def test_a_missing_or_impossible_argument_is_one_line(ferrule, typed):
    ran = ferrule(*typed)
    assert ran.status == 2
    assert ran.err.startswith("ferrule: ") and ran.err.count("\n") == 1


READING = [
    ("sheet", "find", "x"),
    ("sheet", "show", "x"),
    ("site", "list"),
    ("site", "show", "x"),
    ("site", "drop", "x"),
]


@pytest.mark.parametrize("typed", [*READING, ("fit", "-m", "x", "--low", "-5", "--high", "35")])
def test_a_catalog_that_does_not_exist_is_named_and_not_made(ferrule, tmp_path, typed):
    ran = ferrule(*typed)
    assert ran.status == 2
    assert "small.sqlite does not exist" in ran.err and "ferrule sheet load cec" in ran.err
    assert not list(tmp_path.iterdir())


@pytest.mark.parametrize("typed", [*READING, ("site", "add", "x", "--low", "-5", "--high", "35")])
def test_a_damaged_catalog_is_one_line_and_left_alone(ferrule, tmp_path, typed):
    damaged = tmp_path / "small.sqlite"
    damaged.write_bytes(b"no catalog at all " * 300)
    ran = ferrule(*typed)
    assert ran.status == 2
    assert "small.sqlite" in ran.err and "damaged" in ran.err and ran.err.count("\n") == 1
    assert damaged.read_bytes() == b"no catalog at all " * 300


@pytest.fixture
def read_only_catalog(small_catalog) -> Iterator[Path]:
    """A catalog that nobody may write, in a folder that nobody may write but root."""
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder, "catalog.sqlite")
        path.write_bytes(small_catalog.read_bytes())
        path.chmod(0o444)
        Path(folder).chmod(0o555)
        yield path
        Path(folder).chmod(0o755)


def heed_permissions() -> None:
    """Take from root, in a new process, the power to write what is write-protected (capabilities(7))."""
    if os.geteuid() == 0:
        drop_from_bounding_set, dac_override = 24, 1  # of <linux/prctl.h> and <linux/capability.h>
        assert ctypes.CDLL(None).prctl(drop_from_bounding_set, dac_override, 0, 0, 0) == 0


def test_a_read_only_catalog_can_be_read_and_refuses_changes(read_only_catalog):
    before = read_only_catalog.read_bytes()
    found = in_a_shell("sheet", "find", "af6k", "--catalog", read_only_catalog, preexec_fn=heed_permissions)
    assert found.returncode == 0, found.stderr
    assert "AF6K-270P" in found.stdout
    added = in_a_shell(
        "site",
        "add",
        "x",
        "--low",
        "-5",
        "--high",
        "35",
        "--catalog",
        read_only_catalog,
        preexec_fn=heed_permissions,
    )
    assert added.returncode == 2
    assert "read-only" in added.stderr and added.stderr.count("\n") == 1
    assert read_only_catalog.read_bytes() == before


def test_the_option_wins_over_the_environment(ferrule, small_catalog, tmp_path):
    other = tmp_path / "other.sqlite"
    with Catalog.open(other, create=True):
        pass
    assert ferrule("site", "list").out.count("Low Wharf") == 1
    assert "No site is kept" in ferrule("site", "list", "--catalog", other).out


def test_a_reader_that_closes_the_pipe_hears_no_complaint(small_catalog):
    command = [sys.executable, "-m", "cli", "sheet", "show", "af6k270p", "--catalog", str(small_catalog)]
    ran = subprocess.run(
        ["sh", "-c", f"{shlex.join(command)} | true"], capture_output=True, text=True, cwd=ROOT, timeout=120
    )
    assert ran.stderr == ""


def test_of_many_candidates_some_are_listed_and_the_rest_is_a_command_away(ferrule, small_catalog):
    with Catalog.open(small_catalog) as catalog:
        catalog.load([replace(MODULES[0], id=None, model=f"Row {k}") for k in range(101, 113)], [])
    ran = ferrule("fit", "-m", "alderfell row", "--low", "-5", "--high", "35")
    head, *listed, more = ran.err.splitlines()
    assert ran.status == 2 and head.startswith("ferrule: 'alderfell row' could be several")
    assert len(listed) == 10
    found = ferrule(*shlex.split(re.search(r"'ferrule (.+)'", more)[1]), "--limit", 50).out
    assert sum("Row 1" in line for line in found.splitlines()) == 12


def test_plain_text_on_a_terminal(small_catalog, monkeypatch):
    from cli.main import run

    class Terminal(io.StringIO):
        def isatty(self) -> bool:
            return True

    monkeypatch.setenv("TERM", "xterm-256color")
    for name in ("FERRULE_PLAIN", "NO_COLOR"):
        monkeypatch.delenv(name, raising=False)

    def printed(*words: str) -> str:
        monkeypatch.setattr(sys, "stdout", Terminal())
        assert run([*words, "--catalog", str(small_catalog)]) == 0
        return sys.stdout.getvalue()

    styled = printed("site", "list")
    assert "\x1b" in styled
    for words in (("--plain", "site", "list"), ("site", "list", "--plain")):
        assert printed(*words) == re.sub("\x1b\\[[0-9;]*m", "", styled)
    assert "FERRULE_PLAIN" not in os.environ
