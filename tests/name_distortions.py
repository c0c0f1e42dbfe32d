"""Names as suppliers write them: a generator of distorted article texts for tests and measurements.

Common practice, no source: each distortion is one that price lists, delivery notes and scans show. Seeded, so
that a figure can be had again.
"""

from __future__ import annotations

import random
import re
from collections.abc import Sequence

SCAN = {
    "0": "O",
    "O": "0",
    "o": "0",
    "1": "lI",
    "I": "1l",
    "l": "1I",
    "i": "1",
    "5": "S",
    "S": "5",
    "s": "5",
    "8": "B",
    "B": "8",
}
BEFORE = [
    "PV module",
    "Solar panel",
    "Modul",
    "Art. 4711",
    "Pos. 3",
    "12 x",
    "24x",
    "qty 60",
    "1 pallet",
    "NEW",
    "Solarmodul",
    "2 Stk.",
]
AFTER = {
    "module": [
        "poly",
        "mono",
        "monocrystalline",
        "polykristallin",
        "blk frame",
        "black frame",
        "silver frame",
        "slv/wht",
        "60 cells",
        "72 cell",
        "60c",
        "full black",
        "MC4",
        "1000V",
        "35mm frame",
        "tier 1",
        "A-grade",
        "25 yr warranty",
        "backsheet white",
        "multi",
        "PV module",
        "panel",
        "UL listed",
        "IEC 61215",
        "cable 1m",
    ],
    "inverter": [
        "inverter",
        "string inverter",
        "3ph",
        "single phase",
        "grid-tie",
        "transformerless",
        "WR",
        "UL 1741",
        "10 yr warranty",
        "wifi",
        "IP65",
        "incl. DC disconnect",
        "NEW",
        "outdoor",
        "Wechselrichter",
        "AFCI",
    ],
}
ANYWHERE = [
    "pallet 31 pcs",
    "qty 120",
    "qty: 8",
    "2 pallets",
    "24 pcs",
    "in stock",
    "ex works",
    "EUR 89.50",
    "USD 112",
    "ETA wk 34",
    "ab Lager Hamburg",
    "Rotterdam",
    "overstock",
    "surplus",
    "delivery 2 weeks",
    "min. order 10",
    "promo",
    "per piece",
]


def distorted(maker: str, model: str, kind: str, power_w: float, rng: random.Random) -> str:
    """One article text for a record, as some supplier might write it.

    Parameters
    ----------
    maker, model : str
        The record's name.
    kind : str
        ``module`` or ``inverter``.
    power_w : float
        Rated power [W].
    rng : random.Random
        Source of chance.
    """
    volts = re.search(r"\s*\[(\d+)V\]$", model)
    core = model[: volts.start()] if volts else model
    parts = [p for p in (_maker(maker, rng), _model(core, rng)) if p]
    if volts and rng.random() < 0.95:
        v = volts.group(1)
        parts.append(
            rng.choice([f"{v}V", f"{v} V", f"{v}Vac", f"[{v}V]", f"({v}V)", f"{v} VAC", f"@{v}V", v])
        )
    if rng.random() < 0.2:
        parts.reverse()
    if rng.random() < 0.55:
        parts.insert(rng.choice([len(parts), len(parts), 0]), _power(power_w, kind, rng))
    parts += rng.sample(AFTER[kind], rng.choice([0, 1, 1, 2, 3]))
    if rng.random() < 0.25:
        parts.insert(0, rng.choice(BEFORE))
    if rng.random() < 0.35:
        parts.append(rng.choice(ANYWHERE))
    text = (
        rng.choice([" ", " ", " ", ", ", " - ", "  "]).join(parts) if rng.random() < 0.9 else "; ".join(parts)
    )
    if rng.random() < 0.25:
        spaces = [m.start() for m in re.finditer(" ", text)]
        if spaces:
            at = rng.choice(spaces)
            text = text[:at] + "\n" + text[at + 1 :]
    return rng.choice([str, str, str, str.upper, str.upper, str.lower])(text)


def _maker(maker: str, rng: random.Random) -> str:
    words = re.findall(r"[^\s_,.()]+", maker)
    way = rng.random()
    if way < 0.12:
        return ""
    if way < 0.35:
        return maker
    short = [
        w for w in words if w.lower() not in {"co", "ltd", "inc", "llc", "gmbh", "corporation", "corp", "sa"}
    ] or words
    if way < 0.60:
        return " ".join(short)
    if way < 0.75:
        return short[0]
    if way < 0.92:
        return " ".join(
            w if len(w) < 5 or rng.random() < 0.4 else w[: rng.choice([3, 4, 5])] + "." for w in short
        )
    if way < 0.96:
        return "".join(short)
    return _typo(" ".join(short), rng)


def _typo(text: str, rng: random.Random) -> str:
    at = [i for i, c in enumerate(text[:-1]) if c.isalpha() and text[i + 1].isalpha()]
    if not at:
        return text
    i = rng.choice(at)
    return rng.choice(
        [
            text[:i] + text[i + 1 :],
            text[:i] + text[i + 1] + text[i] + text[i + 2 :],
            text[:i] + text[i] + text[i:],
        ]
    )


def _model(model: str, rng: random.Random) -> str:
    way = rng.random()
    if way < 0.25:
        out = model
    elif way < 0.50:
        out = re.sub(r"[-_/().,]+", " ", model)
    elif way < 0.65:
        out = re.sub(r"[-_/(). ,]+", "", model)
    elif way < 0.75:
        out = re.sub(r"[-_/]", lambda m: rng.choice(["-", "/", "_", " - ", ""]), model)
    elif way < 0.90:  # split where letters and digits meet
        seams = [m.end() for m in re.finditer(r"[A-Za-z](?=\d)|\d(?=[A-Za-z])", model)]
        out = model
        for at in sorted(rng.sample(seams, min(len(seams), rng.choice([1, 1, 2]))), reverse=True):
            out = out[:at] + rng.choice([" ", "-"]) + out[at:]
    else:  # words in another order
        pieces: Sequence[str] = re.split(r"[ \-_/]+", model)
        out = " ".join(rng.sample(list(pieces), len(pieces))) if rng.random() < 0.3 else model
    out = " ".join(out.split())
    if rng.random() < 0.18:
        places = [i for i, c in enumerate(out) if c in SCAN]
        for i in rng.sample(places, min(len(places), rng.choice([1, 1, 2]))):
            out = out[:i] + rng.choice(SCAN[out[i]]) + out[i + 1 :]
    return out


def _power(power_w: float, kind: str, rng: random.Random) -> str:
    watts = round(power_w)
    if kind == "module":
        return rng.choice(
            [f"{watts}Wp", f"{watts} Wp", f"{watts}W", f"{watts} W", f"{watts / 1000:g} kWp", f"{watts}Watt"]
        )
    kilo = f"{power_w / 1000:.1f}".rstrip("0").rstrip(".")
    return rng.choice([f"{kilo}kW", f"{kilo} kW", f"{watts}W", f"{watts} W"])
