"""What takes the place of a record, as a file or a document, `ferrule.swap/1`."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from cli.facts import confirm_line
from cli.swap_words import CURRENT, PART_WORDS, VOLTAGE, answer, margin, offer, order, part_notes, question_words
from cli.table_files import Forms, Heading, Sheet, check_entry, confirm_entry, rules_entry, unit_entry
from matcher.options import label

if TYPE_CHECKING:
    from cli.swap import Full, Question
    from matcher.mixing import Mismatch
    from matcher.partswap import PartSwap

SWAP_SCHEMA = "ferrule.swap/1"


def forms(question: Question, full: Full) -> Forms:
    """All candidates in all forms of a file."""
    from cli.swap_report import write_page_of

    return Forms(
        lambda: [Sheet("Candidates", _columns(question), _rows(question, full))],
        lambda: _basis(question, full),
        lambda: document(question, full),
        lambda stream: write_page_of(question, full, stream),
    )


def document(question: Question, full: Full) -> dict[str, Any]:
    """The document; what is not known is null."""
    q, swaps = question, question.swaps
    head = {
        "schema": SWAP_SCHEMA,
        "module": {"maker": q.module.maker, "model": q.module.model, "pmax_w": q.module.pmax_w},
        "inverter": {"maker": q.inverter.maker, "model": q.inverter.model, "ac_power_w": q.inverter.ac_power_w},
        "site": {"name": q.site.name, "design_low_c": q.site.design_low_c, "design_high_c": q.site.design_high_c,
                 "mounting": q.site.mounting, "solved": q.vetted.solved},
        "rules": rules_entry(q.rules),
        "wiring": {"label": label(q.wired), "units": [unit_entry(u) for u in q.wired]},
        "replaces": "inverter" if q.replaces_inverter else "module",
        "part": q.part,
        "order": order(q),
    }  # fmt: skip
    if q.part is not None:
        head["candidates"] = [_part_entry(q, k) for k in range(len(swaps))]
        head["totals"] = {"records_considered": swaps.considered, "looked_at": swaps.looked_at, "sound": len(swaps)}
        return head
    head["candidates"] = [_entry(q, k, full) for k in range(len(swaps))]
    head["totals"] = {"records_considered": swaps.considered, "sound": len(swaps), "stopped": swaps.stopped,
                      "unmatched": swaps.unmatched, "within_pct": q.within_pct, "within": q.within}  # fmt: skip
    return head


def _entry(q: Question, k: int, full: Full) -> dict[str, Any]:
    swaps = q.swaps
    record = q.records[swaps.index[k]]
    entry: dict[str, Any] = {
        "rank": k + 1, "maker": record.maker, "model": record.model,
        "verdict": "to-confirm" if swaps.to_confirm[k] else "fits",
        "changes_pct": {name: _known(values[k]) for name, values in swaps.changes.items()},
        "dc_ac_ratio": float(swaps.ratio[k]), "common_ratio": not bool(swaps.odd[k]), **_stock_entry(q, record),
    }  # fmt: skip
    if not q.replaces_inverter:
        entry["size_change_mm"] = [_known(v) for v in swaps.size_mm[k]]
    if k < len(full):
        o = full[k][1]
        entry |= {
            "label": o.label, "clipping_loss_pct": o.clipping_loss_pct, "yearly_kwh": o.yearly_kwh,
            "checks": [check_entry(c) for c in o.checks],
            "confirm": [confirm_entry(c) for c in o.confirm],
            "climate": {"coldest_c": o.coldest_c, "hottest_c": o.hottest_c},
        }  # fmt: skip
    return entry


def _part_entry(q: Question, k: int) -> dict[str, Any]:
    c = q.swaps.found[k]
    record = q.records[c.index]
    return {
        "rank": k + 1, "maker": record.maker, "model": record.model, "verdict": c.verdict,
        "trackers": [{"inputs": t.inputs, "strings": [{"old": o, "new": n} for o, n in t.strings]} for t in c.trackers],
        "mismatch": {"stc": _mismatch(c.stc), "hot": _mismatch(c.hot), "spread_stc": _mismatch(c.spread_stc)},
        "confirm": [confirm_entry(x) for x in c.confirm], "idle": c.idle, **_stock_entry(q, record),
    }  # fmt: skip


def _stock_entry(q: Question, record: Any) -> dict[str, Any]:
    found = offer(q, record)
    return {} if found is None else {"stock": dict(zip(("pieces", "unit_price", "currency"), found, strict=True))}


def _mismatch(m: Mismatch | None) -> dict[str, float] | None:
    return None if m is None else {"power_w": m.together_w, "apart_w": m.apart_w, "loss_pct": m.loss_pct}


def _known(value: float) -> float | None:
    return None if value != value else float(value)


def _columns(q: Question) -> list[Heading]:
    head: list[Heading] = [("rank", 6, 0), ("verdict", 12, None), ("maker", 22, None), ("model", 28, None)]
    if q.part is not None:
        return [*head, ("power [W]", 9, 0), ("wiring", 40, None), ("loss at STC [%]", 9, 2), ("loss in the heat [%]", 9, 2),
                ("loss if spread [%]", 9, 2), *_stock_columns(q), ("remark", 40, None)]  # fmt: skip
    changes = [(f"change of {name} [%]", 9, 1) for name in q.swaps.changes]
    size = [] if q.replaces_inverter else [("change of length [mm]", 9, 0), ("change of width [mm]", 9, 0)]
    power = ("AC power [W]", 10, 0) if q.replaces_inverter else ("power [W]", 9, 0)
    return [*head, power, *changes, *size, ("DC/AC ratio", 8, 3), ("voltage margin [%]", 9, 1), ("current margin [%]", 9, 1),
            ("clipping loss [%]", 9, 2), ("to confirm", 60, None), *_stock_columns(q), ("remark", 40, None)]  # fmt: skip


def _stock_columns(q: Question) -> list[Heading]:
    return [] if q.stock is None else [("in stock", 9, 0), ("lowest price each", 10, 2), ("currency", 9, None)]


def _rows(q: Question, full: Full) -> list[list[Any]]:
    swaps = q.swaps
    if q.part is not None:
        return [
            [k + 1, c.verdict, (record := q.records[c.index]).maker, record.model, record.pmax_w,
             " | ".join(t.label for t in c.trackers),
             *(None if m is None else m.loss_pct for m in (c.stc, c.hot, c.spread_stc)),
             *(offer(q, record) or ()), _part_remark(c)]
            for k, c in enumerate(swaps.found)
        ]  # fmt: skip
    low, high = swaps.common
    odd = f"of another size altogether: DC/AC ratio outside {low:.2f} to {high:.2f}"
    found = []
    for k in range(len(swaps)):
        record = q.records[swaps.index[k]]
        o = full[k][1] if k < len(full) else None
        power = record.ac_power_w if q.replaces_inverter else record.pmax_w
        size = [] if q.replaces_inverter else [_known(v) for v in swaps.size_mm[k]]
        found.append(
            [k + 1, "to-confirm" if swaps.to_confirm[k] else "fits", record.maker, record.model, power,
             *(_known(v[k]) for v in swaps.changes.values()), *size, float(swaps.ratio[k]),
             margin(o, VOLTAGE) if o else None, margin(o, CURRENT) if o else None,
             o.clipping_loss_pct if o else None, (confirm_line(o) or None) if o else None,
             *(offer(q, record) or ()), odd if swaps.odd[k] else None]
        )  # fmt: skip
    return found


def _part_remark(c: PartSwap) -> str | None:
    if c.stc is None or c.hot is None:
        return "losses not known: isc_coef_pct, voc_coef_pct or pmax_coef_pct is not stated"
    return "adds nothing: the old modules that stay would give as much alone" if c.idle else None


def _basis(q: Question, full: Full) -> list[tuple[str, str]]:
    found = [("Question", question_words(q)), ("Answer", answer(q)), ("Order", order(q))]
    if q.part is not None:
        found.append(("Losses", PART_WORDS))
        found += [("Losses", line) for line in part_notes(q, len(q.swaps))]
    elif len(q.swaps) > len(full):
        found.append(("Margins", f"Margins, clipping and values to confirm are told of the first {len(full)}."))
    return found
