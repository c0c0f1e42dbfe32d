"""What the documents show is what the commands print (``python tests/refresh_examples.py`` renews it)."""

from __future__ import annotations

import difflib
import re
from pathlib import Path

import pytest
from document_parts import fields
from documented_examples import ROOT, Command, Reader, agree, documents, renewed, steps

from catalog.records import Inputs, Inverter, Module, Site
from cli.cautions import CAUTIONS


@pytest.mark.parametrize("path", documents(), ids=lambda path: path.name)
def test_every_example_prints_what_the_document_shows(path: Path, tmp_path: Path):
    reader = Reader(tmp_path)
    for step in steps(path.read_text(encoding="utf-8")):
        printed = reader.do(step)
        if isinstance(step, Command) and not agree(step.shown, printed):
            difference = "\n".join(difflib.unified_diff(step.shown, printed, "shown", "printed", lineterm=""))
            pytest.fail(f"{path.name}, line {step.line + 1}: $ {step.typed}\n{difference}")


@pytest.mark.parametrize("record_type", [Module, Inverter, Inputs, Site], ids=lambda t: t.__name__)
def test_the_tables_of_fields_are_those_of_the_records(record_type: type):
    assert fields(record_type) in (ROOT / "docs" / "file-forms.md").read_text(encoding="utf-8")


def test_an_elision_stands_for_any_lines_and_for_nothing_else():
    printed = ["one", "two", "three", "four", "took 1.5 s"]
    assert agree(["one", "...", "four", "took 0.1 s"], printed)
    assert agree(["...", "three", "..."], printed)
    assert not agree(["one", "...", "three", "took 1.5 s"], printed)
    assert not agree(["two", "..."], printed)
    assert renewed(["eins", "...", "took 0.1 s"], printed) == ["one", "...", "took 1.5 s"]
    assert renewed(["...", "three 3", "...", "x"], printed) == ["...", "three", "...", "took 1.5 s"]


def test_the_readme_opens_with_the_job_and_states_the_cautions():
    blocks = (ROOT / "README.md").read_text(encoding="utf-8").split("\n\n")
    assert blocks[0].startswith("# Ferrule")
    assert blocks[1][0].isalpha()
    said = " ".join(" ".join(blocks).split())
    assert all(caution in said for caution in CAUTIONS)


def test_the_readme_has_two_set_up_commands_of_one_line():
    commands = re.findall(r"```sh\n(.*?)\n```", (ROOT / "README.md").read_text(encoding="utf-8"), re.DOTALL)
    assert len(commands) == 2
    assert "\n" not in "".join(commands)
    assert commands[0].endswith("ferrule demo") and "pytest" in commands[1]


def test_links_between_the_documents_lead_somewhere():
    for path in documents():
        for target in re.findall(r"\]\((?!https?:)([^)#]+)", path.read_text(encoding="utf-8")):
            assert (path.parent / target).exists(), f"{path.name}: {target}"
