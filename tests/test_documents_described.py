"""docs/documents.md describes every document that the commands print, field by field."""

from __future__ import annotations

import json
import re
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pvlib
import pytest
from documented_examples import ROOT

from catalog.records import Inverter, Module, Site, specs

TEXT = (ROOT / "docs" / "documents.md").read_text(encoding="utf-8")

FITS = ("fit", "-m", "klassik 270p", "--site", "butterfield barn")
SWAP = ("swap", "-m", "klassik 270p", "-i", "viola 5", "--site", "butterfield barn")
WEATHER = str(Path(pvlib.__file__).parent / "data" / "723170TYA.CSV")
SHOWN = [
    (*FITS, "--count", "25", "--units", "1..3", "--why"),
    (*FITS, "--yearly-kwh", "9000"),
    (*FITS, "-i", "viola 5", "--by-count", "--energy-price", "0.2", "--module-price", "90"),
    (*FITS, "-i", "cello 10", "--strings", "1x10@115/25,1x12@295/25"),
    (*SWAP, "--strings", "1x12|1x12"),
    (*SWAP, "--count", "24", "--part", "2"),
    (*SWAP, "--count", "24", "--replace", "inverter"),
    (*FITS, "--count", "24", "--in-stock", "--by", "cost"),
    ("stock", "list"),
    ("stock", "grid", "--site", "butterfield barn"),
    ("sheet", "history", "klassik 270p"),
    ("vet", str(ROOT / "seed_catalog" / "bundles.csv")),
    ("vet", "-m", "klassik 275p", "--count", "14", "-i", "fiddle 3"),
    ("sheet", "find", "cello"),
    ("sheet", "find", "klassik"),
    ("sheet", "show", "old faithful 20"),
    ("sheet", "show", "klassik 270p"),
    ("site", "list"),
    ("site", "show", "rimefell"),
    ("site", "add", "Quay", "--low", "-20", "--high", "38", "--weather", WEATHER),
    ("site", "drop", "rimefell"),
]

#: Keys that are verdicts, or names of fields, which docs/file-forms.md lists.
VERDICTS = {"fits", "to-confirm", "does-not-fit", "no-verdict"}
FIELDS = {*specs(Module), *specs(Inverter), *specs(Site)}


@pytest.mark.parametrize("words", SHOWN, ids=lambda words: " ".join(words[:2]))
def test_every_field_of_a_document_is_described(ferrule, demo_catalog: Path, words):
    ran = ferrule(*words, "--json")
    assert ran.status != 2, ran.err
    document = json.loads(ran.out)
    described = set(re.findall(r"`([a-z_0-9]+)`", section(document["schema"])))
    wanted = {key for key in keys(document) if not re.fullmatch(r"[mi]\d+", key)} - VERDICTS
    if not document["schema"].startswith("ferrule.fit/"):
        wanted -= FIELDS
    assert wanted - described - {"schema"} == set()


def test_every_schema_has_a_section():
    names = set()
    for path in (ROOT / "cli").glob("*.py"):
        names |= set(re.findall(r"[\"'](ferrule\.[a-z.-]+/\d+)[\"']", path.read_text(encoding="utf-8")))
    assert {"ferrule.fit/1", "ferrule.sweep-parts/1"} <= names
    assert [name for name in sorted(names) if f"## {name}\n" not in TEXT] == []


def section(schema: str) -> str:
    """What the page says of a schema."""
    return TEXT.split(f"## {schema}\n", 1)[1].split("\n## ", 1)[0]


def keys(document: Any) -> Iterator[str]:
    """All keys of a document, at any depth."""
    if isinstance(document, dict):
        for key, value in document.items():
            yield key
            yield from keys(value)
    elif isinstance(document, list):
        for value in document:
            yield from keys(value)
