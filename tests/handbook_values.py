"""Figures from outside the project, each with its source, for every test that needs them."""

from __future__ import annotations

from catalog.records import Module, Site

#: NFPA 70 (NEC) Table 690.7(A), crystalline and multicrystalline silicon (from memory): warmest and coldest
#: lowest-expected ambient of the band [degC], factor on Voc.
NEC_690_7_A = (
    (24, 20, 1.02),
    (19, 15, 1.04),
    (14, 10, 1.06),
    (9, 5, 1.08),
    (4, 0, 1.10),
    (-1, -5, 1.12),
    (-6, -10, 1.14),
    (-11, -15, 1.16),
    (-16, -20, 1.18),
    (-21, -25, 1.20),
    (-26, -30, 1.21),
    (-31, -35, 1.23),
    (-36, -40, 1.25),
)

#: Global Sustainable Energy Solutions, "Calculating Module Voltages", 2011, worked examples:
#: quantity, value at STC [V], coefficient [V/K], cell temperature [degC], value at that temperature [V].
GSES_2011 = (
    ("vmp", 35.4, -0.16, 55.0, 30.6),
    ("vmp", 36.4, -0.17, 70.0, 28.75),
    ("voc", 45.8, -0.13, 0.0, 49.05),
)

#: NEC 690.8(A)(1) and 690.8(B) (from memory): factor on Isc for circuit current, and for overcurrent devices.
NEC_690_8_A1 = 1.25
NEC_690_8_B = 1.25 * 1.25

#: Stand-off adders to NOCT [K]: Gilman 2015, NREL/TP-6A20-64102, the table that `pvlib.temperature.noct_sam`
#: carries, here by stand-off in inches: over 3.5, 2.5 to 3.5, 0.5 to 1.5, under 0.5.
GILMAN_2015 = {
    "open-rack": (4.0, 0.0),
    "gap-roof": (3.0, 2.0),
    "near-roof": (1.0, 11.0),
    "integrated": (0.25, 18.0),
}


def gses_question(quantity: str, at_stc: float, per_kelvin: float, cell_c: float) -> tuple[Module, Site]:
    """A module and a site that ask for one of the GSES examples: Voc of the cold or Vmp of the hot cell."""
    coefficient = 100 * per_kelvin / at_stc
    is_voc = quantity == "voc"
    module = Module(
        maker="GSES",
        model="example",
        technology="Mono-c-Si",
        bifacial=False,
        pmax_w=180.0,
        voc_v=at_stc if is_voc else 45.0,
        isc_a=5.5,
        vmp_v=36.0 if is_voc else at_stc,
        imp_a=5.0,
        voc_coef_pct=coefficient if is_voc else -0.35,
        vmp_coef_pct=-0.45 if is_voc else coefficient,
        noct_c=44.0,  # 30 K above ambient at 1000 W/m2
    )
    low, high = (cell_c, 35.0) if is_voc else (0.0, cell_c - 30)
    return module, Site(name="GSES", design_low_c=low, design_high_c=high)
