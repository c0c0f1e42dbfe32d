"""From the words of the command line to a request that the matcher understands."""

from __future__ import annotations

from catalog.errors import CatalogError
from catalog.records import Site
from cli.ranges import array_of, number_range, whole_range
from matcher.fit import Request
from matcher.order import Order
from matcher.rules import RULE_SETS, RuleSet


def rule_set(name: str) -> RuleSet:
    """A rule set by name, or a user's own by the path of its file.

    Raises
    ------
    CatalogError
        Where there is none of this name, or the file holds none.
    """
    if name.lower().endswith(".toml"):
        from cli.rule_files import read_rule_set

        return read_rule_set(name)
    if name not in RULE_SETS:
        from catalog.near import nearest

        hint = nearest(name, RULE_SETS, 1).replace("; near to it: ", "; did you mean ")
        mean = f"{hint}?" if "mean" in hint else ";"
        raise CatalogError(
            f"--rules {name}: there is no such rule set{mean} choose {' or '.join(RULE_SETS)}, or a file that ends in .toml"
        )
    return RULE_SETS[name]


def request_of(
    site: Site,
    ratio: str,
    count: str | None,
    clip_cap: float,
    rules: str,
    combiner: bool,
    by: str,
    every: bool,
    units: str = "1",
    strings: str | None = None,
) -> Request:
    """A request from the command line's values.

    Raises
    ------
    CatalogError
        Where one of them is not understood or not possible.
    """
    if not 0 <= clip_cap <= 100:
        raise CatalogError(f"--clip-cap {clip_cap:g}: a clipping loss is 0 to 100 %")
    if by not in list(Order):
        raise CatalogError(f"--by {by}: choose one of {', '.join(Order)}")
    array, faces = (None, ()) if strings is None else array_of(strings)
    return Request(
        site=site,
        rules=rule_set(rules),
        ratio=number_range(ratio, "--ratio"),
        counts=None if count is None else whole_range(count, "--count"),
        units=whole_range(units, "--units"),
        strings=array,
        faces=faces,
        clip_cap_pct=clip_cap,
        combiner=combiner,
        order=Order(by),
        every=every,
    )
