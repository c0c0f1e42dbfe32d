"""Run the examples of the documents and write what they print into them; renew what is made from the code.

Run from the root of the project: ``python tests/refresh_examples.py [DOCUMENT...]``. Look at the difference
before you commit it: what changed there is what users see change.
"""

from __future__ import annotations

import sys
import tempfile
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent.parent))

from document_parts import with_parts  # noqa: E402
from documented_examples import Command, Reader, documents, renewed, steps  # noqa: E402


def refresh(path: Path) -> int:
    """Refresh one document; return how many outputs changed."""
    text = path.read_text(encoding="utf-8")
    lines = text.splitlines()
    changes: list[tuple[Command, list[str]]] = []
    with tempfile.TemporaryDirectory() as folder:
        reader = Reader(Path(folder).resolve())
        for step in steps(text):
            printed = reader.do(step)
            if isinstance(step, Command) and (now := renewed(step.shown, printed)) != step.shown:
                changes.append((step, now))
    for step, now in reversed(changes):
        lines[step.line + 1 : step.line + 1 + len(step.shown)] = now
    now = with_parts("\n".join(lines) + "\n")
    if now != text:
        path.write_text(now, encoding="utf-8")
    return len(changes)


if __name__ == "__main__":
    for document in [Path(name) for name in sys.argv[1:]] or documents():
        print(f"{document}: {refresh(document)} outputs changed")
