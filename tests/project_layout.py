"""The files of the packages, each with the first sentence of its docstring, as DEVELOPERS.md lists them."""

from __future__ import annotations

import ast
import re
from collections.abc import Iterator
from pathlib import Path

ROOT = Path(__file__).parent.parent
PACKAGES = ("catalog", "matcher", "cli", "seed_catalog")

def files(package: str) -> list[Path]:
    """Python files of a package, its ``__init__.py`` first."""
    return sorted((ROOT / package).glob("*.py"), key=lambda path: (path.name != "__init__.py", path.name))


def listing() -> str:
    """The listing of DEVELOPERS.md."""
    parts = []
    for package in PACKAGES:
        init, *others = files(package)
        parts.append(f"\n### {package}\n\n{_sentence(init)}\n")
        if others:
            rows = [f"| `{path.relative_to(ROOT).as_posix()}` | {_sentence(path)} |" for path in others]
            parts.append("\n".join(["| file | purpose |", "| --- | --- |", *rows]) + "\n")
    return "\n".join(parts).strip("\n")


def _sentence(path: Path) -> str:
    text = " ".join((ast.get_docstring(_tree(path)) or "").split("\n\n")[0].split())
    first = re.match(r".*?[.?!](?=\s+[A-Z`]|$)", text)
    return (first[0] if first else text).replace("``", "`").replace("|", "\\|")


def imports(path: Path) -> Iterator[str]:
    """Names of the modules that a file imports, wherever in it."""
    for node in ast.walk(_tree(path)):
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom) and node.module:
            if node.module in PACKAGES:
                yield from (f"{node.module}.{alias.name}" for alias in node.names)
            else:
                yield node.module


def _tree(path: Path) -> ast.Module:
    return ast.parse(path.read_text(encoding="utf-8"))
