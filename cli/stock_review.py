"""``ferrule stock review`` and ``decide``: what articles mean that their text does not tell for sure."""

from __future__ import annotations

import sys
from collections.abc import Collection, Mapping, Sequence
from typing import TYPE_CHECKING, Annotated

import typer

from catalog.errors import CatalogError
from cli.kinds import KINDS
from cli.opening import CatalogOption, open_catalog

if TYPE_CHECKING:
    from catalog.names import NameIndex
    from catalog.stock import StockItem, Suggestion
    from catalog.store import Catalog

#: Open articles that are printed with their candidates.
_SHOWN = 20
#: Candidates of an article: of those that come near, and where none does.
_NEAR, _FAR = 5, 3


def review(catalog: CatalogOption = None) -> None:
    """Go through the articles in stock that wait for a decision: asked one by one on a terminal, else listed.

    Answer with the number of a candidate, with a name, with 'none' for what is no record of the catalog, with
    nothing to leave it open, or with 'q' to stop. Each answer is kept at once.

    Example: ferrule stock review
    """
    from cli.console import say

    with open_catalog(catalog) as opened:
        say_matched(opened)
        if not sys.stdin.isatty():
            if not say_open(opened, opened.stock()):
                say("Nothing waits for a decision.")
            return
        done = _ask_all(opened)
        left = sum(item.open for item in opened.stock())
    say(f"{done:,} decided, {left:,} still open.")


def decide(
    article: Annotated[str, typer.Argument(metavar="ARTICLE", help="Number or text of the article in the list.")],
    name: Annotated[str | None, typer.Argument(metavar="NAME", help='The record that it means, "Maker Model".')] = None,
    none: Annotated[bool, typer.Option("--none", help="It is no record of the catalog: leave it out.")] = False,
    catalog: CatalogOption = None,
) -> None:
    """Say which record an article of the stock list means; it holds for this list and those that follow.

    Example: ferrule stock decide LL-M13 "Marzipan Photovoltaik Klassik 270P"
    """
    from cli.choosing import choose
    from cli.console import counted, say

    if (name is None) != none:
        raise CatalogError("say which record the article means, or that it is none: NAME or --none")
    with open_catalog(catalog) as opened:
        items = _items_of(opened.stock(), article)
        record, called = None, "no record of the catalog"
        if name is not None:
            kinds = tuple(dict.fromkeys(item.kind for item in items if item.kind)) or KINDS
            record = choose(opened, name, kinds)
            called = _name_of(opened, record)
        lines = sum(opened.decide_stock(item, record) for item in _unlike(items))
    say(f"{items[0].label}: {called} ({counted(lines, 'line')}).")


def say_matched(catalog: Catalog) -> None:
    """Match what waits for a decision once more, and say what is sure by now."""
    from cli.console import counted, say

    found = _unlike(catalog.match_waiting())
    if not found:
        return
    say(f"{counted(len(found), 'article')} in stock that waited for a decision {'is' if len(found) == 1 else 'are'} sure now:")
    for item in found[:_SHOWN]:
        say(f"{item.label}: {_name_of(catalog, (item.kind, item.record))}", indent=2)
    if len(found) > _SHOWN:
        say(f"... and {len(found) - _SHOWN:,} more", indent=2)


def say_open(catalog: Catalog, items: Sequence[StockItem]) -> int:
    """Print the articles that wait for a decision, with candidates; return how many there are."""
    from cli.console import counted, say
    from cli.quoting import quoted

    waiting = _unlike([item for item in items if item.open])
    if not waiting:
        return 0
    names = catalog.name_indexes()
    say()
    say("Not sure which record is meant:")
    for item in waiting[:_SHOWN]:
        say(f"{item.label} ({counted(item.quantity, 'piece')})", indent=2)
        found = _candidates(item, names)
        for _, line in found:
            say(line, indent=6)
        if not found:
            say("No record is near to it.", indent=6)
    if len(waiting) > _SHOWN:
        say(f"... and {len(waiting) - _SHOWN:,} more", indent=2)
    unlike = [item.kind for item in waiting if item.confidence == "none"]
    if unlike:
        say(f"What is like none of them {_not_loaded(unlike)}")
    first = quoted(waiting[0].article or waiting[0].text)
    say("Decide with 'ferrule stock review' on a terminal, or one by one (--none: no record of the catalog):")
    print(f'  ferrule stock decide {first} "Maker Model"')
    return len(waiting)


def _not_loaded(kinds: Collection[str | None]) -> str:
    """What to do where no record comes near, or none that is offered is meant."""
    kind = "|".join(k for k in KINDS if not {k, None}.isdisjoint(kinds))
    return f"may not be loaded yet: 'ferrule sheet load FILE' or 'ferrule sheet enter {kind}', then it is matched again."


def _candidates(item: StockItem, names: Mapping[str, NameIndex]) -> list[tuple[Suggestion, str]]:
    from catalog.stock import suggestions

    called = {(kind, n.id): n.name for kind, index in names.items() for n in index.names}
    # Where none is near, more of them are noise.
    found = suggestions(item, names, _FAR if item.confidence == "none" else _NEAR)
    return [(s, f"{k}  {called[s.kind, s.id]}") for k, s in enumerate(found, start=1)]


def _ask_all(catalog: Catalog) -> int:
    """Ask for every open article; return how many were decided."""
    from cli.console import counted, note, say

    names = catalog.name_indexes()
    done = 0
    for item in _unlike([item for item in catalog.stock() if item.open]):
        now = next((i for i in catalog.stock() if i.id == item.id), item)
        if not now.open:
            continue  # decided together with one of the same text
        say(f"{item.label} ({counted(item.quantity, 'piece')}{', ' + item.place if item.place else ''})")
        found = _candidates(item, names)
        for _, line in found:
            say(line, indent=2)
        if item.confidence == "none":
            say(f"{'Its datasheet' if not found else 'What is like none of them'} {_not_loaded([item.kind])}", indent=2)
        while True:
            answer = typer.prompt("number, name, none, q", default="", show_default=False).strip()
            if answer.casefold() == "q":
                return done
            if not answer:
                break
            try:
                record = _meant(catalog, item, answer, [s for s, _ in found])
                catalog.decide_stock(item, record)
            except CatalogError as problem:
                note(str(problem))
                continue
            done += 1
            break
        say()
    return done


def _meant(catalog: Catalog, item: StockItem, answer: str, found: Sequence[Suggestion]) -> tuple[str, int] | None:
    from cli.choosing import choose

    if answer.casefold() == "none":
        return None
    if answer.isdigit() and 1 <= int(answer) <= len(found):
        chosen = found[int(answer) - 1]
        return chosen.kind, chosen.id
    return choose(catalog, answer, (item.kind,) if item.kind else KINDS)


def _unlike(items: Sequence[StockItem]) -> list[StockItem]:
    """One line of each article and text."""
    from catalog.stock import decision_key

    found: dict[tuple[str, str], StockItem] = {}
    for item in items:
        found.setdefault(decision_key(item), item)
    return list(found.values())


def _items_of(items: Sequence[StockItem], article: str) -> list[StockItem]:
    from catalog.near import nearest
    from catalog.namekeys import squeezed

    wanted = squeezed(article)
    for field in ("article", "text"):
        found = [item for item in items if squeezed(getattr(item, field)) == wanted]
        if found:
            return found
    if not items:
        raise CatalogError("no stock list is kept: load one with 'ferrule stock load FILE'")
    raise CatalogError(f"no article in stock is called {article!r}{nearest(article, [i.article or i.text for i in items])}")


def _name_of(catalog: Catalog, record: tuple[str, int]) -> str:
    kind, id_ = record
    return (catalog.module(id_) if kind == "module" else catalog.inverter(id_)).name
