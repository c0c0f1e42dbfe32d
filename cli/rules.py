"""``ferrule rules``: the rule sets there are, and one as a file to start from."""

from __future__ import annotations

from typing import Annotated

import typer

from catalog.errors import CatalogError


def rules(
    name: Annotated[str | None, typer.Argument(metavar="[NAME]", help="Rule set to print, iec-62548 or nec-690.")] = None,
) -> None:
    """List the rule sets, or print one as a file to start your own from.

    Keep what it prints in a file that ends in .toml, change what differs, and give the file to --rules.

    Example: ferrule rules iec-62548
    """
    from cli.rule_files import as_toml
    from matcher.rules import RULE_SETS

    if name is not None:
        if name not in RULE_SETS:
            raise CatalogError(f"there is no rule set {name!r} to print: name {' or '.join(RULE_SETS)}")
        print(as_toml(RULE_SETS[name]), end="")
        return
    for known in RULE_SETS.values():
        fuse = f"{known.fuse_low:g}" + ("" if known.fuse_high is None else f" to {known.fuse_high:g}")
        print(f"{known.name:<10} design current {known.isc_factor:g} x Isc, string fuse from {fuse} x Isc")
    print("'ferrule rules NAME > own.toml' makes a file to start your own from, for --rules own.toml.")
