"""The grid of what is in stock as a file or a document, `ferrule.grid/1`."""

from __future__ import annotations

import csv
import json
import sys
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import IO, TYPE_CHECKING, Any

from cli.fit_files import replacing, safe
from matcher.checks import Verdict

if TYPE_CHECKING:
    from cli.years import SiteYear
    from matcher.grid import Grid, GridPair
    from matcher.near import Rejection

SCHEMA = "ferrule.grid/1"


@dataclass(frozen=True, slots=True)
class Shown:
    """A grid with what its tables say beside it: the year, and the pieces in stock by id of the record."""

    grid: Grid
    year: SiteYear
    pieces: Mapping[int, int]


def letter(verdict: Verdict) -> str:
    """The letter of a verdict: F fits, C to confirm."""
    return "F" if verdict is Verdict.FITS else "C"


def write(shown: Shown, path: Path) -> None:
    """Write the grid; the ending decides the form.

    Raises
    ------
    CatalogError
        Where the file cannot be written.
    """
    form = path.suffix.lower()
    with replacing(path, binary=form in (".xlsx", ".png")) as stream:
        if form in (".svg", ".png"):
            from cli.grid_picture import draw

            draw(shown, stream, form)
        elif form == ".xlsx":
            from cli.grid_workbook import write_workbook

            write_workbook(shown, stream)
        elif form == ".json":
            json.dump(document(shown), stream, allow_nan=False, indent=1)
        else:
            _write_csv(shown, stream)


def print_document(shown: Shown) -> None:
    """Print the document on stdout."""
    json.dump(document(shown), sys.stdout, allow_nan=False, indent=1)
    print()


def document(shown: Shown) -> dict[str, Any]:
    """The document `ferrule.grid/1`: one entry per pair that goes together, and what goes with nothing.

    ``fewest``, ``most`` and ``counts`` are the lowest, the highest and the number of module counts of one inverter
    that have the verdict; ``best`` is the first option in the order of ``fit``.
    """
    from cli.documents import head, inverter_key, module_key, option_entry

    fit = shown.grid.fit
    sides = (("modules", fit.modules, module_key), ("inverters", fit.inverters, inverter_key))
    records = {
        side: {
            key(fit, k): {"maker": r.maker, "model": r.model, "pieces": shown.pieces[r.id]} for k, r in enumerate(some)
        }
        for side, some, key in sides
    }
    pairs = []
    for p in shown.grid.pairs.values():
        best = option_entry(fit, p.best, with_checks=False)
        for name in ("rank", "verdict", "module", "inverter", "units", "cost", "currency"):
            best.pop(name, None)
        pairs.append(
            {
                "module": module_key(fit, p.module),
                "inverter": inverter_key(fit, p.inverter),
                "verdict": str(p.verdict),
                "fewest": p.fewest,
                "most": p.most,
                "counts": p.counts,
                "best": best,
                "confirm": [{"record": c.record, "field": c.field, "at_least": c.at_least} for c in p.best.confirm],
            }
        )
    alone = [
        {
            "kind": kind,
            kind: own_key(fit, own),
            "nearest_with": other_key(fit, other),
            "failed": list(reason.failed),
            "nearest": reason.nearest,
        }
        for kind, lone, own_key, other_key in (
            ("module", shown.grid.lone_modules, module_key, inverter_key),
            ("inverter", shown.grid.lone_inverters, inverter_key, module_key),
        )
        for own, other, reason in lone
    ]
    return head(fit, shown.year.weather) | {"schema": SCHEMA} | records | {"pairs": pairs, "alone": alone}


#: Columns of the list form: header with unit.
HEADERS = (
    "module_maker", "module_model", "modules_in_stock", "inverter_maker", "inverter_model", "inverters_in_stock",
    "verdict", "fewest_modules", "most_modules", "module_counts", "best_arrangement", "best_modules",
    "best_dc_ac_ratio", "best_clipping_loss_pct", "stopped_by", "nearest",
)  # fmt: skip


def pair_values(shown: Shown, pair: GridPair) -> list[Any]:
    """One pair as a row of `HEADERS`."""
    b = pair.best
    return [
        *_names(shown, pair.module, pair.inverter), str(pair.verdict), pair.fewest, pair.most, pair.counts, b.label,
        b.modules, b.dc_ac_ratio, b.clipping_loss_pct, None, None,
    ]  # fmt: skip


def lone_values(shown: Shown, module: int, inverter: int, reason: Rejection) -> list[Any]:
    """The nearest pair of what goes with nothing as a row of `HEADERS`."""
    return [*_names(shown, module, inverter), "does-not-fit", *[None] * 7, ", ".join(reason.failed), reason.nearest]


def rows(shown: Shown) -> list[list[Any]]:
    """Pairs by module and inverter, then what goes with nothing."""
    grid = shown.grid
    found = [pair_values(shown, grid.pairs[key]) for key in sorted(grid.pairs)]
    found += [lone_values(shown, m, i, reason) for m, i, reason in grid.lone_modules]
    return found + [lone_values(shown, m, i, reason) for i, m, reason in grid.lone_inverters]


def _names(shown: Shown, m: int, i: int) -> list[Any]:
    module, inverter = shown.grid.modules[m], shown.grid.inverters[i]
    return [module.maker, module.model, shown.pieces[module.id], inverter.maker, inverter.model,
            shown.pieces[inverter.id]]  # fmt: skip


def _write_csv(shown: Shown, stream: IO[str]) -> None:
    writer = csv.writer(stream)
    writer.writerow(HEADERS)
    for row in rows(shown):
        writer.writerow([_text(value) for value in row])


def _text(value: Any) -> Any:
    if isinstance(value, float):
        return f"{value:.6g}"
    return safe(value) if isinstance(value, str) else value
