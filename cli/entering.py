"""A record that is being entered: which fields are asked for, what was answered, what is wrong with it."""

from __future__ import annotations

import json
from dataclasses import dataclass, field
from typing import Any

from catalog.assignments import relative_resolved, value_for
from catalog.errors import CatalogError
from catalog.inputs_text import EXAMPLE, parse_inputs
from catalog.records import FieldSpec, Inputs, Inverter, Module, Origin, Source, specs
from catalog.sheet_values import BLANKS

KINDS: dict[str, type] = {"module": Module, "inverter": Inverter}

SOURCE = FieldSpec("source", str, "", "document you read from, and its revision or date", True)
INPUTS = FieldSpec("inputs", str, "", "tracker groups: what is left out is not known", False)

#: What an answer looks like. Invented values that go together.
EXAMPLES: dict[str, dict[str, str]] = {
    "module": {
        "source": "Alderfell AF6K datasheet, rev C", "maker": "Alderfell Solar", "model": "AF6K-270P", "technology": "Mono-c-Si",
        "cells_in_series": "60", "bifacial": "no", "bifaciality": "0.7", "pmax_w": "270", "voc_v": "38.2", "isc_a": "9.2",
        "vmp_v": "31.1", "imp_a": "8.68", "voc_coef_pct": "-0.31 or -118 mV/K", "isc_coef_pct": "0.05 or 4.6 mA/K",
        "pmax_coef_pct": "-0.41", "vmp_coef_pct": "-0.42", "noct_c": "45", "max_system_voltage_v": "1000",
        "max_series_fuse_a": "20", "length_m": "1.65 or 1650 mm", "width_m": "0.99 or 990 mm",
    },
    "inverter": {
        "source": "Quillon QN datasheet, 2031-04", "maker": "Quillon", "model": "QN-5000", "ac_power_w": "5000 or 5 kW",
        "ac_voltage_v": "230", "phases": "1", "max_dc_voltage_v": "600", "mppt_low_v": "150", "mppt_high_v": "480",
        "start_voltage_v": "120", "max_array_power_w": "7500", "inputs": EXAMPLE, "weighted_efficiency_pct": "97.2", "night_w": "1",
    },
}  # fmt: skip


def asked_fields(kind: str) -> list[FieldSpec]:
    """Fields that are asked for, the required ones first. Model parameters of the public tables are on no datasheet."""
    known = [spec for spec in specs(KINDS[kind]).values() if spec.name in EXAMPLES[kind]]
    optional = [spec for spec in known if not spec.required]
    if kind == "inverter":
        optional.insert(1, INPUTS)
    return [SOURCE, *(spec for spec in known if spec.required), *optional]


@dataclass(slots=True)
class Entering:
    """Answers so far, as they were typed, by field; a blank answer says that the value is not known."""

    kind: str
    answers: dict[str, str] = field(default_factory=dict)

    def pointless(self, spec: FieldSpec) -> bool:
        """Whether there is nothing to ask: what is not bifacial has no bifaciality."""
        return spec.name == "bifaciality" and self.values().get("bifacial") is False

    def to_bytes(self) -> bytes:
        """To keep it as a draft."""
        return json.dumps(self.answers).encode()

    @staticmethod
    def from_bytes(kind: str, data: bytes | None) -> Entering:
        """A draft that was kept; an empty one if there is none."""
        try:
            found = json.loads(data or b"{}")
            known = {spec.name for spec in asked_fields(kind)}
            return Entering(kind, {k: v for k, v in found.items() if k in known and isinstance(v, str)})
        except (ValueError, AttributeError):
            return Entering(kind)

    def answer(self, spec: FieldSpec, text: str) -> list[str]:
        """Take an answer; returns remarks on what is unusual about it.

        Raises
        ------
        CatalogError
            If it cannot be; nothing is taken then.
        """
        text = text.strip()
        if text.casefold() in BLANKS:
            text = ""
        if not text and spec.required:
            raise CatalogError(f"{spec.name} is needed: a {self.kind} without it cannot be matched")
        before = set(self._findings("odd"))
        tried = Entering(self.kind, self.answers | {spec.name: text})
        # Reading the values raises for a text that is not understood.
        tried.values()
        for finding in tried._findings("impossible"):
            raise CatalogError(finding)
        self.answers[spec.name] = text
        return [line for line in self._findings("odd") if line not in before]

    def values(self) -> dict[str, Any]:
        """Values by field of the answers; coefficients such as mV/K once the value at STC is known."""
        found = {}
        for spec in asked_fields(self.kind):
            text = self.answers.get(spec.name, "")
            if text and spec is not SOURCE:
                found[spec.name] = parse_inputs(text) if spec is INPUTS else value_for(spec, text)
        return relative_resolved(found)

    def record(self) -> Module | Inverter:
        """The record that the answers make, once all required ones are there; its values are ``entered``."""
        values = self.values()
        origins = {name: Origin.ENTERED for name in values if name not in ("maker", "model")}
        if self.kind == "inverter" and "inputs" not in values:
            values["inputs"] = (Inputs(trackers=1),)
            origins["inputs"] = Origin.ASSUMED
        return KINDS[self.kind](**values, source=Source(self.answers["source"]), origins=origins)

    def _findings(self, severity: str) -> list[str]:
        """What is impossible or odd about the values so far; what is still missing is no finding."""
        from catalog.plausibility import findings

        values = self.values()
        type_ = KINDS[self.kind]
        blank = {
            spec.name: "?" if spec.type is str else None for spec in specs(type_).values() if spec.required
        }
        found = findings(type_(**(blank | values)))
        return [f.message for f in found if f.severity == severity and f.field in values]
