"""Self-contained pages: one frame for all results, and what their tables and lists are made of."""

from __future__ import annotations

import base64
import hashlib
import re
from dataclasses import dataclass
from datetime import date
from importlib.resources import files
from typing import IO, TYPE_CHECKING, Any

from cli import facts
from cli.cautions import CAUTIONS
from cli.console import number

if TYPE_CHECKING:
    from cli.pictures import Picture
    from matcher.checks import Check

#: Rows of a table that a browser still sorts at once.
ROWS = 4_000

#: Rows of it that go to paper.
PRINTED = 100

MARKS = {
    "fits": "\u25cf", "to-confirm": "\u25d0", "does-not-fit": "\u2715", "note": "\u25cb", "no-verdict": "?",
}  # fmt: skip

#: What each check compares, for readers who do not know its name.
CHECK_WORDS = {
    "max-dc-voltage": "open-circuit voltage in the cold, against the inverter",
    "system-voltage": "open-circuit voltage in the cold, against the module",
    "voltage-cap": "open-circuit voltage in the cold, against the cap of the site",
    "mppt-low": "voltage at maximum power in the heat, against the bottom of the MPPT window",
    "mppt-high": "voltage at maximum power at 25 °C, against the top of the MPPT window",
    "start": "open-circuit voltage in the heat, against the start voltage",
    "short-circuit": "design short-circuit current of a tracker",
    "string-inputs": "strings on a tracker, against its inputs",
    "array-power": "array power, against what the inverter takes",
    "cold-tracking": "voltage at maximum power in the cold, against the top of the MPPT window",
    "input-current": "operating current of a tracker",
    "tracker-power": "power on a tracker",
    "string-fuse": "reverse current into a faulty string, against the module's series fuse",
}


@dataclass(frozen=True, slots=True)
class Column:
    """A column of the options' table; its kind is n (number), word (verdict), name or text."""

    header: str
    kind: str = "n"


@dataclass(frozen=True, slots=True)
class Cell:
    """Text of a cell, and the number it sorts by; ``None`` sorts by the text."""

    text: str
    key: float | None = None


def write_page(template: str, stream: IO[str], content: dict[str, Any]) -> None:
    """Write a page: what ``template`` says of ``content``, in the frame that all pages share.

    ``content`` holds the title, question, answer and ``rests_on`` of the frame besides what the template asks for.
    """
    from jinja2 import Environment, PackageLoader, StrictUndefined

    pages = Environment(
        loader=PackageLoader("cli"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    script, style = (
        files("cli").joinpath(f"templates/report.{kind}").read_text("utf-8") for kind in ("js", "css")
    )
    digest = base64.b64encode(hashlib.sha256(script.encode()).digest()).decode()
    frame = {
        "title": f"Ferrule: {content['question']}",
        "made": f"{date.today():%d %B %Y}".lstrip("0"),
        "cautions": CAUTIONS,
        "marks": MARKS,
        "printed": PRINTED,
        "style": style.replace("{{ printed + 1 }}", str(PRINTED + 1)),
        "script": script,
        "script_hash": f"sha256-{digest}",
    }
    pages.get_template(template).stream(frame | content).dump(stream)


def check_row(c: Check) -> dict[str, str]:
    """One check in words, as the table of reasons shows it."""
    digits = 0 if c.unit in ("W", "1") else 1
    unit = "" if c.unit == "1" else f" {c.unit}"
    limit = "not on record" if c.limit is None else number(c.limit, digits) + unit
    remarks = [c.rule, *([c.remark] if c.remark else [])]
    if c.confirm is not None:
        remarks.append(f"settled by a {facts.confirm_words(c.confirm)}")
    return {
        "words": CHECK_WORDS.get(c.check, c.check),
        "name": c.check,
        "verdict": str(c.verdict),
        "value": "" if c.value is None else number(c.value, digits) + unit,
        "limit": limit,
        "margin": "" if c.margin_pct is None else f"{c.margin_pct:.1f} %".replace("-", "\u2212"),
        "rule": "; ".join(remarks),
    }


def figure(picture: Picture, caption: str) -> dict[str, str]:
    """A picture with what stands above it."""
    return {"svg": picture.svg, "title": picture.title, "caption": typeset(caption)}


def typeset(text: str) -> str:
    """Numbers kept together with their units, true minus signs and the sign of degrees Celsius."""
    text = text.replace("degC", "°C")
    text = re.sub(r"(?<=\d) (?=(?:%|°C|V|A|W|kWh)(?!\w))", "\u00a0", text)
    return re.sub(r"(?<![\w.])-(?=\d)", "\u2212", text)


def end_cell(value: float | str | None, cold: bool, beyond: float) -> Cell:
    """One end of the climate window; any temperature sorts beyond every number."""
    if value is None:
        return Cell("?")
    return Cell(value, beyond) if isinstance(value, str) else Cell(typeset(facts.whole(value, cold)), value)
