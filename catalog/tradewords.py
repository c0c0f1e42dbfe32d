"""Words of price lists and delivery notes that are no part of a name: finishes, packing, units, legal forms.

Common practice, no source: collected from how such lists are usually written, in the languages the trade uses.
"""

from __future__ import annotations

import re

from catalog.namekeys import folded

_TRADE = """
poly polycrystalline polykristallin policristalino policristallino multi multicrystalline mc pc mono monocrystalline
monokristallin monocristalino monocristallin monocristallino cryst crystalline perc topcon hjt ibc shingled tandem thin
film thinfilm cdte cigs cis amorphous csi bifacial bifi monofacial halfcut half cut split full cell cells cel zellen
celdas cellules celle busbar busbars
blk black blck schwarz noir negro nero slv silver silber argent plata sil wht white weiss blanc blanco bianco clr clear
anodized anodised alu aluminium aluminum frame framed frameless fr frm rahmen cadre marco cornice backsheet bs bsheet
backsh bob bow all glass gg glassglass dual double tempered coated ar arc arcoating junction box jbox connector
connectors conn cable cables lead leads mc tyco
module modules mod modul module moduli modulo modulos mdl panel panels pnl panneau panneaux paneel panelen pannello
pannelli placa pv photovoltaic photovoltaik fotovoltaico fotovoltaica solar solarmodul solarpanel solarmodule sol slr
inverter inverters inv invert wechselrichter wr onduleur inversor omvormer string central micro microinverter hybrid
gridtie grid tie tied transformerless tl afci rsd dc ac phase phases ph single three split outdoor indoor wifi wlan
watt watts wp w kw kwp kva kwac va mw vdc vac volt volts v amp amps mm cm kg lbs lb inch in hz
pallet pallets plt pal pall palette paletten pallette palet skid container cont cntr fcl lcl truck box boxes ctn carton
kit set lot batch bundle pack packed pkg pk loose full part rest
qty quantity menge anz anzahl qte cant cantidad pcs pce pc pieces piece stk stck stuck stueck st ea each unit units un
uds pz pzs x no nr num number pos position item items art article artikel artnr sku ref code id
new neu neuf nuevo nuovo used refurb refurbished unused surplus overstock clearance promo promotion special offer sale
stock stk lager avail available disp verfugbar instock delivery del lieferung eta ex exw ddp dap cif fob works warehouse
wh whse week wk price preis prix precio prezzo net netto gross brutto incl excl inc vat mwst tva iva tax usd eur gbp chf
euro dollar per pro each
grade class klasse cat quality tier bstock a b approx ca about min max nom nominal rated rating power pmax pmpp voc isc
vmp imp stc noct output leistung potenza potencia puissance
warranty garantie garantia yr yrs year years ul iec tuv ce cec listed certified cert rohs fire type typ model modell
modele modelo series serie version vers rev made origin usa us eu eea china cn germany de mcs
and und et y e with w mit avec con for fur pour para the of or and incl
"""

_LEGAL = """
inc incorporated corp corporation co company ltd limited llc llp lp plc gmbh ag kg se sa sas sarl srl spa sl slu bv nv ab
as aps oy oyj kk pty pte pvt bhd sdn group holding holdings international intl
"""

_COMPANY = """
solar energy energie energia power technology technologies tech electric electronics electronic electrical new green
renewable renewables sun pv photovoltaic photovoltaics science industry industries industrial systems system
semiconductor global modules products enterprise manufacturing
"""

_UNITS = """
w wp watt watts wc wac wdc kw kwp kwac kva va v vdc vac volt volts a amp amps mm cm m kg lb lbs in hz c cell cells cel z
zellen pc pcs pce st stk stck ea x un uds pz ph phase p yr yrs y year years bb mppt mpp mppts pct k
"""

#: Folded words that say nothing about which record is meant.
TRADE = frozenset(folded(word) for word in (_TRADE + _LEGAL).split())
#: Folded words of makers' names that too many makers share to tell them apart.
COMMON = frozenset(folded(word) for word in (_COMPANY + _LEGAL).split())
#: Folded units, as they stand alone after a number.
UNITS = frozenset(folded(word) for word in _UNITS.split() if word not in {"m", "a", "z", "p", "y", "k"})
#: Words that announce a number of pieces.
COUNTS = frozenset(folded(word) for word in "qty quantity menge anz anzahl qte cant cantidad x pos no nr".split())

_MEASURE = re.compile(r"[\doil|sb]*\d[\doil|sb]*?(?:" + "|".join(sorted(_UNITS.split(), key=len, reverse=True)) + ")")
_SPECIFICATION = re.compile(
    r"x\d+|qty\d+|ip\d\d|mc\d|t4|h4|pv\d|iec\d+|ul\d+|en\d+|\d+bb|\d+x\d+(x\d+)?|\d+(ph|hc)|\d+in|[1-4]p|20[12]\d|a{1,3}\d?"
)


def is_measure(word: str) -> bool:
    """Whether a case-folded word is a number with its unit ("270wp", "60c", "24x"), scanner's letters allowed."""
    return _MEASURE.fullmatch(word) is not None


def is_trade(word: str) -> bool:
    """Whether a case-folded word is a word of the trade, or a mark such as "mc4" or "ip67"."""
    return folded(word) in TRADE or _SPECIFICATION.fullmatch(word) is not None
