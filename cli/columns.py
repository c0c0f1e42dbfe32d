"""What the columns of someone's table are: shown, confirmed or corrected, and kept for the next such table."""

from __future__ import annotations

import sys
from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass, field

from catalog.column_map import ColumnMap, MappedColumn
from catalog.errors import CatalogError
from catalog.records import FieldSpec
from catalog.sheet_needs import set_option, what_is_needed
from cli.console import counted
from cli.opening import open_catalog
from cli.quoting import quoted

_KEY = "said/columns/"


def pairs(texts: Sequence[str], option: str, example: str) -> dict[str, str]:
    """``NAME=VALUE`` texts as a mapping.

    Raises
    ------
    CatalogError
        Naming the text without an equals sign.
    """
    found = {}
    for text in texts:
        name, mark, value = text.rpartition("=") if option == "--map" else text.partition("=")
        if not mark or not name.strip():
            raise CatalogError(f'{option} {text!r}: write it like {option} "{example}"')
        found[name.strip()] = value.strip()
    return found


@dataclass(slots=True)
class Columns:
    """Settles the columns of tables while files are read (see `catalog.sheet_tables`).

    ``said`` are fields by heading from the command line; ``yes`` accepts what is doubtful; ``given`` are the fields
    that the command line gives for all rows. ``lacking`` is set where a table was refused: fields that no column of
    it gives.
    """

    catalog: str | None
    said: Mapping[str, str]
    yes: bool
    given: Collection[str] = ()
    settled: list[ColumnMap] = field(default_factory=list)
    lacking: tuple[FieldSpec, ...] | None = None
    _used: set[str] = field(default_factory=set)

    def settle(self, proposed: ColumnMap) -> ColumnMap:
        """The map to use instead of the one that is proposed.

        Raises
        ------
        CatalogError
            Where columns are doubtful and nobody is there to ask, or no column gives what every record needs.
        """
        self.lacking = None
        found, before = self._kept(proposed) or proposed, "as kept from a table with these headings"
        own = self._own(found)
        self._used |= set(own)
        remark = "" if found is proposed else f", {before}"
        if own:
            found = found.with_fields(own)
        self._show(found, remark)
        lacking = found.without(self.given)
        asking = not self.yes and sys.stdin.isatty() and sys.stderr.isatty()
        doubtful = () if self.yes or asking else found.doubtful
        if doubtful or lacking:
            self.lacking = lacking
            raise CatalogError("\n".join(_wanted(found, doubtful, lacking)))
        if found.doubtful:
            found = self._asked(found) if asking else found.confirmed()
            self.settled.append(found)
        elif own:
            self.settled.append(found)
        return found

    def as_it_seems(self, proposed: ColumnMap) -> ColumnMap:
        """The map with all that is doubtful taken for true, to find what else is wrong with a table."""
        found = self._kept(proposed) or proposed
        return found.with_fields(self._own(found)).confirmed()

    def _own(self, found: ColumnMap) -> dict[str, str]:
        """Fields from the command line whose headings the table has."""
        headings = {" ".join(c.heading.casefold().split()) for c in found.columns}
        return {h: name for h, name in self.said.items() if " ".join(h.casefold().split()) in headings}

    def check_used(self) -> None:
        """Refuse headings from the command line that no table has.

        Raises
        ------
        CatalogError
        """
        unused = [heading for heading in self.said if heading not in self._used]
        if unused:
            raise CatalogError(
                f"--map {unused[0]!r}: no table with headings of its own has such a column; write the heading as the"
                " file has it"
            )

    def keep(self, opened: object) -> int:
        """Keep in the catalog what was confirmed or said; returns how many tables."""
        return sum(opened.keep(_KEY + found.signature, found.to_bytes()) for found in self.settled)  # type: ignore[attr-defined]

    def _kept(self, proposed: ColumnMap) -> ColumnMap | None:
        try:
            with open_catalog(self.catalog, readonly=True) as opened:
                data = opened.kept(_KEY + proposed.signature)
        except CatalogError:
            # No catalog yet: the load makes it.
            return None
        found = ColumnMap.from_bytes(data) if data else None
        same = found is not None and [c.heading.casefold() for c in found.columns] == [
            c.heading.casefold() for c in proposed.columns
        ]
        return found if same else None

    def _show(self, found: ColumnMap, remark: str) -> None:
        columns = [c for c in found.columns if c.heading]
        width = min(max((len(c.heading) for c in columns), default=0), 44)
        print(f"Columns, one {found.kind} a row{remark}:", file=sys.stderr)
        for column in columns:
            print(f"  {column.heading:<{width}}  {_meant(column)}", file=sys.stderr)

    def _asked(self, found: ColumnMap) -> ColumnMap:
        """The map with what a person says of every doubtful column."""
        said = {}
        for column in found.doubtful:
            print(f"{column.heading}: {_meant(column)} -- Enter accepts, n leaves it out, or name a field: ",
                  end="", file=sys.stderr, flush=True)  # fmt: skip
            answer = sys.stdin.readline()
            if not answer:
                raise CatalogError("left before the columns were confirmed; nothing was loaded")
            answer = answer.strip()
            if answer.casefold() in ("n", "no"):
                said[column.heading] = ""
            elif answer and answer.casefold() not in ("y", "yes"):
                said[column.heading] = answer
        return found.with_fields(said).confirmed()


def _wanted(
    found: ColumnMap, doubtful: Sequence[MappedColumn], lacking: Sequence[FieldSpec]
) -> Iterator[str]:
    """All that a person has to say before a table can be loaded, and the options that say it."""
    parts = [f"{counted(len(doubtful), 'column')} to confirm"] if doubtful else []
    parts += [f"{counted(len(lacking), 'value')} that no column gives"] if lacking else []
    yield " and ".join(parts) + ":"
    for column in doubtful:
        yield f"  {column.heading!r} is {_meant(column).replace(' ? (', '? (')}"
    for spec in lacking:
        yield f"  {spec.name}: {what_is_needed(spec)}"
    left = [c.heading for c in found.columns if c.field is None and c.heading]
    options = ["--yes"] if doubtful else []
    options += [set_option(spec) or f"--set {spec.name}=..." for spec in lacking if spec.name != "model"]
    if options:
        with_what = ", with what is true of all rows" if lacking else ""
        yield f"  add to the command{with_what}: {' '.join(options)}"
    if doubtful:
        first = doubtful[0]
        one, none = quoted(f"{first.heading}={first.field}"), quoted(f"{first.heading}=")
        yield f"  or say one column: --map {one}; --map {none} leaves it out"
    if lacking and left:
        yield f'  or, if one of the columns left out is meant ({", ".join(left)}): --map "HEADING=FIELD"'


def _meant(column: MappedColumn) -> str:
    return str(column).removeprefix(f"{column.heading}: ")
