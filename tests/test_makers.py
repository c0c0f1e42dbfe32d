"""Maker and model of module names, against splits verified by eye on the public CEC module table."""

from __future__ import annotations

import pytest

from catalog.makers import split_maker

TRUE_SPLITS = [
    # a number begins the model
    ("A10Green Technology", "A10J-S72-175"),
    ("Ablytek", "5MN6C175-A0"),
    ("Advanced Solar Power (Hangzhou)", "ASP-S1-80"),
    ("Astronergy Solarmodule", "ASM6610P 250"),
    ("Atersa (Aplicaciones Tecnicas de la Energia)", "A-225P"),
    ("BIPV", "BIPV050-S11"),
    ("Day4 Energy", "Day4 60MC-I 250"),
    ("E&H", "EHS3-228"),
    ("Green Energy Solar & Wind", "GESW1750 USA-170W"),
    ("Helios USA", "6T p215"),
    ("Hengdian Group DMEGC Magnetics", "DM175-M125-72"),
    ("Itek Energy LLC", "iT-220"),
    ("Kenmos Photovoltaic", "aTT-50W-02"),
    ("Kyung Won", "KWL-210 S"),
    ("Mage Solar", "190/5 MR"),
    ("Ningbo Ulica Solar Science & Technology", "165(35) D UL811x1581"),
    ("REC ScanModule", "SCM205"),
    ("REC Solar", "REC380TP2SM 72 XV BLK"),
    ("Samsung SDI", "LPC235SM-02"),
    ("Sunarray", "SUNARRAY-M6B2409-130"),
    ("SweModule", "220 x"),
    ("T & Solar", "TSS3-228"),
    ("Tianwei New Energy (Chengdu) PV Module", "TW155(35)D"),
    ("U.S. Solar", "USS-QCMI2-36-130"),
    ("Yes! Solar", "ES190W-NW"),
    ("Zhangjiagang City SEG PV", "SEGM5-72 170W"),
    # a legal form ends the maker
    ("Amerisolar-Worldwide Energy and Manufacturing USA Co._ Ltd", "AS-6M-350W"),
    ("BYD Company Limited", "BYD 225P6C-30"),
    ("Chint Solar (Zhejiang) Co._ Ltd.", "CHSM6612M-380"),
    ("Hanwha Q CELLS (Qidong) Co._ Ltd.", "Q.PRIME L-G5.1.G 330"),
    ("Japan Solar (Infini Co._ Ltd)", "JS-170M-TCI72"),
    ("MAR SOLAR PANEL IMALATI VE ELEKTRIK URT. DAG. PRJ. HİZ. SAN. VE TİC. A.S.", "MS605PUL-260"),
    ("Mundra Solar PV Ltd.", "ASM - 7 - PERC - 335"),
    ("Phono Solar Technology Co._Ltd.", "PS 250P-20/UV"),
    ("SANYO ELECTRIC CO LTD OF PANASONIC GROUP", "HIP-186DA3"),
    ("Silfab Solar Inc", "SLA-X 285 Clear"),
    ("SmartFlower Energy Technology GmbH", "SFE 155"),
    ("SolarWorld Americas Inc", "Sunmodule Plus SWA 270 mono black"),
    ("SUN M ENERGY SDN BHD", "ES200PCFW"),
    # the model repeats the maker's first word
    ("alfasolar", "alfasolar P6L60-220"),
    ("BYD (Huizhou) Battery", "BYD 120P6-18"),
    ("Conergy", "Conergy Black 170M"),
    ("Conergy Holding", "CONERGY ON 220-60"),
    ("Nanosolar", "Nanosolar Utility Panel 200W"),
    ("ONYX SOLAR ENERGY S.L.", "ONYX G/G M06666"),
    ("Solaria Corporation", "Solaria PowerXT-440C-PD"),
    ("Solon", "Solon Blue XT 265"),
    ("XL Telecom & Energy", "XL 30225"),
    # dotted names and product lines
    ("A2Peak Power", "POWER ON P220-6x10"),
    ("Avancis", "PowerMax STRONG 115"),
    ("CertainTeed", "Apollo Tile II-54"),
    ("Conergy", "Solarmodule PowerPlus 215P"),
    ("Du Pont Apollo", "DA095-A2"),
    ("Freevolt", "SW Premium 275"),
    ("Hanwha Q CELLS", "Q.PEAK DUO BLK-G5/SC 320"),
    ("Hanwha Q CELLS", "Q.PLUS-BFR G4.1/TAA 290"),
    ("Hanwha Q CELLS", "Q.PRO BFR - G3 245"),
    ("Hanwha Q CELLS", "B.LINE PLUS L-G4.2 317"),
    ("KISCO", "GETWATT 224P-A1U"),
    ("Luxor Solar", "Solo Line 140M"),
    ("Mage Solar USA", "Powertec Plus 190/5 MH-US"),
    ("Q-Cells North America", "Q.Peak BLK 245"),
    ("Schott Solar", "PERFORM POLY 245"),
    ("Vikram Solar", "ELDORA VSP.60.255.03.04"),
    # a code before the number
    ("Antaris Solar", "AS P 230"),
    ("Bosch Solar Energy", "c-Si M 60-225-16"),
    ("Bosch Solar Thin Film", "um-Si plus 105"),
    ("Dongfang Electric (Yixing) MAGI", "MGSM-235-60"),
    ("Dow Chemical", "PH 2.0-32"),
    ("GAF", "RIAC 1000"),
    ("Gintech Energy", "GIN P6-48-200"),
    ("LS Industrial Systems", "PVM S228"),
    ("Moser Baer Photovoltaic", "MBPV CAAP BB 210W"),
    ("Moser Baer Solar", "MBSL eLITE 60 3x 225"),
    ("Prism Solar Technologies", "B 145"),
    ("Schuco USA", "S 165-SPU"),
    ("Solar Liberty", "SLX 235 USB"),
    ("Sonali Energees USA", "SS 1200 P"),
    ("U.S. Yabang Solar Energy", "CSM 295D/C"),
    ("Universal Energy Nanjing Solar Technology", "UE M180HR"),
    ("Webel SL Energy Systems", "W 1750-170 Wp"),
    # no number at all
    ("Applied Materials", "Full Size Tandem Junction"),
    ("Armageddon Energy", "SolarClover Dual Module"),
    ("CertainTeed", "APOLLO TILE-B"),
    ("LUMA Resources", "LRSS"),
    ("Pythagoras Solar", "Midi PVGU Window"),
]


@pytest.mark.parametrize("maker, model", TRUE_SPLITS)
def test_true_splits(maker, model):
    assert split_maker(f"{maker} {model}") == (maker, model)


def test_true_splits_are_rows_of_the_table(cec_modules_csv):
    assert {f"{maker} {model}" for maker, model in TRUE_SPLITS} <= set(cec_modules_csv.Name)


@pytest.mark.parametrize(
    "maker, model",
    [
        # invented names in the forms that company registers use
        ("Blue Ferry Solar Corporation of North Holm", "BF-400M"),
        ("Brindle & Sons Energy Pte. Ltd.", "Brindle Max 410"),
        ("Quarrel Photovoltaics Co.,Ltd.", "QP 395 BLK"),
        ("Ostrava Sunworks S.p.A.", "Vela Nera 380"),
        ("HARROW PV-TECH", "HPT5-NH120-400"),
    ],
)
def test_makers_the_table_does_not_have(maker, model):
    assert split_maker(f"{maker} {model}") == (maker, model)


def test_blanks_count_as_one_and_one_word_has_no_model():
    assert split_maker("  Jinko Solar  Co._ Ltd JKM370M-72L ") == ("Jinko Solar Co._ Ltd", "JKM370M-72L")
    assert split_maker("Nomodel") == ("Nomodel", "")
    assert split_maker("") == ("", "")
