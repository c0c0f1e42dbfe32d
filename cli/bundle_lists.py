"""Lists of bundles as people keep them: which column holds what, and which records the names in it mean."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from catalog.errors import CatalogError
from catalog.namekeys import compact

if TYPE_CHECKING:
    from catalog.names import NameIndex
    from catalog.tabular import TableRow

#: Words that head the columns (common practice, no source), by what they hold.
HEADINGS: dict[str, tuple[str, ...]] = {
    "article": ("article", "article no", "article number", "sku", "item", "item no", "code", "bundle", "kit", "set", "id"),
    "module": ("module", "module type", "module model", "pv module", "solar module", "panel", "panel type", "modul"),
    "modules": (
        "modules", "number of modules", "no of modules", "module count", "modules qty", "module qty", "qty modules",
        "qty of modules", "panels", "number of panels", "panel qty", "module pcs", "modules pcs", "anzahl module",
    ),
    "inverter": ("inverter", "inverter type", "inverter model", "wechselrichter"),
    "units": (
        "inverters", "number of inverters", "no of inverters", "inverter count", "inverter qty", "inverters qty",
        "qty inverters", "qty of inverters", "units", "inverter pcs", "anzahl wechselrichter",
    ),
    "strings": ("strings", "wiring", "arrangement", "string plan", "stringing"),
    "site": ("site", "place", "location"),
}  # fmt: skip

#: Headings of a number that belongs to the module or inverter beside it.
_QUANTITIES = ("qty", "quantity", "pcs", "pieces", "count", "no", "number", "amount", "stk", "anzahl", "pc")

NEEDED = ("module", "modules", "inverter")

#: Likeness of two headings, 0 to 100, from which a column is taken for what it is like.
_LIKE = 84.0


@dataclass(frozen=True, slots=True)
class BundleRow:
    """One row: what stands in it, as text, and its number in the file."""

    number: int
    article: str
    module: str
    modules: str
    inverter: str
    units: str
    strings: str
    site: str


@dataclass(frozen=True, slots=True)
class BundleList:
    """The rows of a list, and what each column was taken for."""

    rows: tuple[BundleRow, ...]
    mapping: tuple[str, ...]


def read_bundles(path: str) -> BundleList:
    """Read a list of bundles, CSV or XLSX.

    Raises
    ------
    CatalogError
        Where the file cannot be read, or no column holds the modules, their number or the inverters.
    """
    from catalog.tabular import read_table

    table = read_table(path, lambda text: _likeness(text)[1] >= _LIKE or _plain(text) in _QUANTITIES)
    columns = columns_of(table.headings)
    missing = [field for field in NEEDED if field not in columns]
    if missing:
        found = ", ".join(h for h in table.headings if h)
        raise CatalogError(
            f"{path}, row {table.heading_row}: no column for {' and '.join(missing)} among {found}; name it"
            f" {' and '.join(repr(m) for m in missing)}"
        )
    mapping = tuple(f"{table.headings[k]!r} is {field}" for field, k in sorted(columns.items(), key=lambda e: e[1]))
    ignored = [h for k, h in enumerate(table.headings) if h and k not in columns.values()]
    if ignored:
        mapping += (f"not used: {', '.join(ignored)}",)
    return BundleList(tuple(_row(r, columns) for r in table.rows), (*table.notes, *mapping))


def columns_of(headings: Sequence[str]) -> dict[str, int]:
    """Which column holds which field, by the likeness of its heading; the likest where several are."""
    likes = sorted(
        ((*_likeness(text), k) for k, text in enumerate(headings) if text), key=lambda like: (-like[1], like[2])
    )
    columns: dict[str, int] = {}
    taken: set[int] = set()
    for field, score, k in likes:
        if score >= _LIKE and field not in columns and _plain(headings[k]) not in _QUANTITIES:
            columns[field] = k
            taken.add(k)
    for k, text in enumerate(headings):
        if k not in taken and _plain(text) in _QUANTITIES:
            field = _belongs_to(k, columns)
            if field is not None:
                columns[field] = k
                taken.add(k)
    return columns


def _belongs_to(k: int, columns: dict[str, int]) -> str | None:
    """What a bare quantity counts: the module or inverter left of it, else the one right of it."""
    sides = [(abs(at - k), at > k, kind) for kind in ("module", "inverter") if (at := columns.get(kind)) is not None]
    for _, _, kind in sorted(sides, key=lambda s: (s[1], s[0])):
        field = "modules" if kind == "module" else "units"
        if field not in columns:
            return field
    return None


def _likeness(text: str) -> tuple[str, float]:
    from rapidfuzz import fuzz

    plain = _plain(text)
    return max(
        ((field, max(fuzz.token_sort_ratio(plain, word) for word in words)) for field, words in HEADINGS.items()),
        key=lambda like: like[1],
    )


def _plain(text: str) -> str:
    words = "".join(c if c.isalnum() else " " for c in text.casefold())
    return " ".join(words.split())


def _row(row: TableRow, columns: dict[str, int]) -> BundleRow:
    def text(field: str) -> str:
        cell = row.cells[columns[field]] if field in columns else None
        if cell is None:
            return ""
        if isinstance(cell, float) and cell == int(cell):
            cell = int(cell)
        return str(cell).strip()

    return BundleRow(row.number, *(text(f) for f in ("article", "module", "modules", "inverter", "units", "strings", "site")))


class Reader:
    """Names of a list made into records; each text is looked at once."""

    def __init__(self, index: NameIndex, kind: str) -> None:
        self._index, self._kind = index, kind
        self._full = {n.name.casefold(): n.id for n in index.names}
        self._name = {n.id: n.name for n in index.names}
        self._model = {n.id: n.model for n in index.names}
        self._known: dict[str, int | str] = {}

    def read(self, text: str) -> int | str:
        """Id of the record that a text means beyond doubt, or why there is none."""
        if text not in self._known:
            self._known[text] = self._read(text)
        return self._known[text]

    def read_as(self, text: str) -> str:
        """The record that a text was read as, where its model does not stand in the text; blank where it does."""
        id_ = self.read(text)
        if isinstance(id_, str) or compact(self._model[id_]) in compact(text):
            return ""
        return f"{self._kind} {text!r} read as {self._name[id_]}"

    def _read(self, text: str) -> int | str:
        from catalog.names import look_up, resolve

        if not text:
            return f"no {self._kind} is named"
        exact = self._full.get(" ".join(text.casefold().split()))
        if exact is not None:
            return exact
        found = resolve(text, self._index)
        if found.confidence == "sure":
            return found.candidates[0].id
        candidates = found.candidates
        if found.confidence == "none" or not candidates:
            # What is too little for a text may be a part of a name that several records have.
            typed = look_up(text, self._index)
            candidates = typed.candidates if typed.match is not None or typed.ambiguous else []
            if not candidates and typed.candidates:
                near = ", ".join(self._name[c.id] for c in typed.candidates[:3])
                return f"no {self._kind} of the catalog is called {text!r}; near to it: {near}"
        if not candidates:
            return f"no {self._kind} of the catalog is like {text!r}"
        near = " or ".join(self._name[c.id] for c in candidates[:3])
        if len(candidates) == 1:
            return f"{self._kind} {text!r}: did you mean {near}? write it so"
        more = " or others" if len(candidates) > 3 else ""
        return f"{self._kind} {text!r}: choose among {near}{more}"


def whole(text: str, what: str) -> int | str:
    """A number of pieces, or why it is none."""
    plain = text.replace("\u00a0", "").replace(" ", "").removesuffix("x").removesuffix("pcs").removesuffix("pc")
    plain = plain.replace(",", "") if plain.count(",") == 1 and len(plain.split(",")[1]) == 3 else plain
    if plain.isdecimal() and int(plain) > 0:
        return int(plain)
    return f"{what} {text!r}: write a whole number above 0" if text else f"no {what} is given"
