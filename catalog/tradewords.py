"""Words of price lists and delivery notes that are no part of a name: finishes, packing, units, legal forms.

Common practice, no source: collected from how such lists are usually written, in the languages the trade
uses.
"""

from __future__ import annotations

import re

from catalog.namekeys import folded

_TRADE = """
poly polycrystalline polykristallin policristalino policristallino multi multicrystalline mono
monocrystalline monokristallin monocristalino monocristallin monocristallino cryst crystalline perc
topcon shingled tandem thin film thinfilm cdte cigs amorphous csi bifacial bifi monofacial halfcut half
cut split full cell cells zellen celdas cellules celle busbar busbars blk black blck schwarz noir negro
nero slv silver silber argent plata wht white weiss blanc blanco bianco clear anodized anodised alu
aluminium aluminum frame framed frameless frm rahmen cadre marco cornice backsheet bsheet backsh glass
glassglass dual double tempered coated arcoating junction box jbox connector connectors conn cable cables
lead leads tyco module modules mod modul moduli modulo modulos mdl panel panels pnl panneau panneaux
paneel panelen pannello pannelli placa pv photovoltaic photovoltaik fotovoltaico fotovoltaica solar
solarmodul solarpanel solarmodule sol slr inverter inverters inv invert wechselrichter wr onduleur
inversor omvormer string central micro microinverter hybrid gridtie grid tie tied transformerless afci
rsd phase phases single three outdoor indoor wifi wlan disconnect watt watts wp kw kwp kwpeak kva kwac
vac vdc volt volts amp amps mm cm kg lbs lb inch hz pallet pallets plt pal pall palette paletten pallette
palet skid container cont cntr fcl lcl truck boxes ctn carton kit set lot batch bundle pack packed pkg
loose part rest qty quantity menge anz anzahl qte cant cantidad pcs pce pieces piece stk stck stuck
stueck each unit units uds pzs nr num number pos position item items art article artikel artnr sku ref
code new neu neuf nuevo nuovo used refurb refurbished unused surplus overstock clearance promo promotion
special offer sale stock lager avail available disp verfugbar instock delivery del lieferung eta exw ddp
dap cif fob works warehouse whse week weeks wks day days price preis prix precio prezzo net netto gross
brutto incl excl inc vat mwst tva iva tax usd eur gbp chf euro dollar per pro order min max grade class
klasse quality tier bstock approx about nom nominal rated rating power pmax pmpp voc isc vmp imp stc noct
output leistung potenza potencia puissance warranty garantie garantia years year yrs listed certified
cert rohs ul iec tuv type typ model modell modele modelo series serie version vers made origin china
germany und with mit avec con pour para the and
"""

#: Short words of the trade that are just as often part of a type: explained only away from the model.
_CODES = """
mc pc hjt ibc cis cel clr fr bs bob bow all gg ar arc ac dc tl ph in out w v x no st ea un u pz id wh wk
ex each a b ca yr ce cec fire rev us usa eu eea cn de mcs et y e of or for fur zu ab je l sil sp d p k m
"""

_LEGAL_LONG = """
inc incorporated corp corporation company ltd limited llc gmbh sarl bhd group holding holdings
"""
_LEGAL_SHORT = "co llp lp plc ag kg se sa sas srl spa sl slu bv nv as aps oy oyj kk pty pte pvt sdn"

_COMPANY = """
solar energy energie energia power technology technologies tech electric electronics electronic
electrical new green renewable renewables sun pv photovoltaic photovoltaics science industry industries
industrial systems system semiconductor global international intl modules products enterprise
manufacturing
"""

_UNITS = """
w wp watt watts wc wac wdc kw kwp kwac kva v vdc vac volt volts amp amps mm cm kg lb lbs hz cell cells
cel zellen pc pcs pce st stk stck ea x un uds pz ph phase yr yrs year years mppt mpps mpp pct
"""
_COUNTED = (
    "pallet pallets plt pal pieces modules module panels panel units unit boxes weeks week days wk container"
)
_ANNOUNCING = (
    "qty quantity menge anz anzahl qte cant cantidad pos nr eur usd gbp chf wk tier order min max art sku eta"
)


def _folded(words: str) -> frozenset[str]:
    return frozenset(folded(word) for word in words.split())


#: Folded words that say nothing about which record is meant.
TRADE = _folded(_TRADE + _LEGAL_LONG)
#: The same, but only away from the model; beside it they may be part of another type's name.
CODES = _folded(_CODES + _LEGAL_SHORT)
#: Folded words of makers' names that too many makers share to tell them apart by one of them.
COMMON = _folded(_COMPANY + _LEGAL_LONG + _LEGAL_SHORT)
#: Those that tell nothing at all.
HOLLOW = TRADE | _folded(_LEGAL_LONG + _LEGAL_SHORT)
#: Folded units, and other words that make a number before them a measure or a count.
UNITS = _folded(_UNITS)
COUNTED = _folded(_UNITS + _COUNTED)
#: Words that make a number after them a count, a price or the like.
ANNOUNCING = _folded(_ANNOUNCING)

_MEASURE = re.compile(
    r"[\doil|sb]*\d[\doil|sb]*?(?:" + "|".join(sorted(_UNITS.split(), key=len, reverse=True)) + ")"
)
_SPECIFICATION = re.compile(
    r"x\d+|qty\d+|ip\d\d|mc\d|iec\d+|ul\d+|[2-9]bb|\d+x\d+(x\d+)?|[13]ph|[1-9]m"
    r"|(36|48|54|60|66|72|96|108|120|132|144)[cz]"
)


def is_in(word: str, some: frozenset[str]) -> bool:
    """Whether a case-folded word is one of some folded words; no number is, though "18" looks like "lb"."""
    return not word.isdigit() and folded(word) in some


def as_letters(word: str) -> str:
    """A word whose letters a scanner took for digits: "8lk" is "blk"."""
    return word.translate(str.maketrans("0158|", "olsbl"))


def is_measure(word: str) -> bool:
    """Whether a case-folded word is a number with its unit ("270wp", "24x"), scanner's letters allowed."""
    return _MEASURE.fullmatch(word) is not None


def is_trade(word: str) -> bool:
    """Whether a case-folded word is a word of the trade, or a mark such as "mc4" or "ip67"."""
    return is_in(word, TRADE) or _SPECIFICATION.fullmatch(word) is not None
