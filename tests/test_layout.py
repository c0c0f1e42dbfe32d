"""The layout holds: every file is listed, imports go one way, and starting up waits for nothing heavy."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest
from project_layout import PACKAGES, ROOT, files, imports

#: What each package may import of the others.
ALLOWED = {
    "catalog": (),
    "seed_catalog": (),
    "matcher": ("catalog.records",),
    "cli": ("catalog", "matcher", "seed_catalog"),
}

SOURCES = [path for package in PACKAGES for path in files(package)]


def test_every_file_is_listed_for_contributors():
    guide = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
    missing = [p.relative_to(ROOT).as_posix() for p in SOURCES if p.name != "__init__.py"]
    missing = [name for name in missing if f"`{name}`" not in guide]
    assert not missing, "run python tests/refresh_examples.py DEVELOPERS.md"


@pytest.mark.parametrize("path", SOURCES, ids=lambda path: path.relative_to(ROOT).as_posix())
def test_imports_go_one_way(path: Path):
    package = path.relative_to(ROOT).parts[0]
    allowed = (package, *ALLOWED[package])
    across = [name for name in imports(path) if name.split(".")[0] in PACKAGES]
    assert not [n for n in across if not any(n == a or n.startswith(f"{a}.") for a in allowed)]


def test_starting_up_loads_nothing_heavy():
    heavy = "{'pvlib', 'pandas', 'sqlmodel', 'sqlalchemy', 'scipy', 'numpy', 'matplotlib', 'jinja2'}"
    code = f"import sys, cli.main; print(sorted(set(sys.modules) & {heavy}))"
    ran = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, cwd=ROOT, check=True)
    assert ran.stdout.strip() == "[]"
