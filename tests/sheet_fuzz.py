"""Random datasheet files, sound and damaged, in all forms; shared by the tests and the long run of the benchmarks."""

from __future__ import annotations

import io
import json
import zipfile
from pathlib import Path
from tempfile import TemporaryDirectory

from catalog_records import INVERTERS, MODULES
from hypothesis import strategies as st

from catalog.column_map import ColumnMap
from catalog.errors import CatalogError
from catalog.sheetfiles import read_sheets, write_sheets
from catalog.store import Catalog

_HEADINGS = (
    "maker", "Manufacturer", "model", "Model No.", "Cell type", "technology", "bifacial", "Pmax (W)", "Power", "pmax_w", "Voc (V)",
    "voc_v", "Open circuit voltage [mV]", "Isc (A)", "Vmp", "Imp (A)", "TK Voc (mV/K)", "Temp. coeff. Pmax", "NOCT (\u00b0C)", "Length",
    "Dimensions (mm)", "kind", "inputs", "sources", "entered", "assumed", "Rated AC power (kW)", "MPPT voltage range (V)", "No. of MPPTs",
    "Strings per MPPT", "Max. input current per MPPT (A)", "Max. DC voltage", "Phases", "", "Price", "Voc at NOCT",
)  # fmt: skip
_CELLS = st.one_of(
    st.sampled_from((
        "", "Paper Sun", "P-400", "mono", "yes", "no", "400", "45.6", "45,6", "1.500", "1,500", "1 500,0", "-0.27", "-0,27 %/K", "180 - 850",
        "2/1", "26 A", "1722 x 1134 x 30", "module", "inverter", "2 trackers: 26 A", "voc_v = a [b]", "voc_v", "nan", "inf", "1e999", "=1+1", "'",
        "0", "-", "\u2212", "\u00b1", "\ud7ff", "three-phase", "9" * 400, "_1_0", "0x10", "\u0664\u0665", "10 V/K",
    )),
    st.text(max_size=6),
    st.floats().map(str),
)  # fmt: skip


def _sound(ending: str) -> bytes:
    with TemporaryDirectory() as folder:
        path = Path(folder) / f"a.{ending}"
        write_sheets(path, MODULES, INVERTERS)
        return path.read_bytes()


_SOUND = {ending: _sound(ending) for ending in ("csv", "toml", "json", "xlsx")}


@st.composite
def _damaged(draw, data: bytes, most: int = 5) -> bytes:
    """Bytes with some of them replaced, taken out or doubled."""
    found = bytearray(data)
    for _ in range(draw(st.integers(0, most))):
        at = draw(st.integers(0, max(len(found) - 1, 0)))
        length = draw(st.integers(0, 4))
        found[at : at + length] = draw(
            st.one_of(
                st.binary(max_size=3), st.sampled_from((b"\n", b",", b'"', b"[", b"}", b"-", b"1e9", b"\xff"))
            )
        )
    return bytes(found)


@st.composite
def _damaged_workbook(draw) -> bytes:
    """A workbook with one of its parts damaged, and sound as an archive."""
    with zipfile.ZipFile(io.BytesIO(_SOUND["xlsx"])) as archive:
        parts = {name: archive.read(name) for name in archive.namelist()}
    name = draw(st.sampled_from(sorted(parts)))
    parts[name] = draw(_damaged(parts[name]))
    if draw(st.integers(0, 9)) == 0:
        del parts[draw(st.sampled_from(sorted(parts)))]
    memory = io.BytesIO()
    with zipfile.ZipFile(memory, "w") as archive:
        for part, content in parts.items():
            archive.writestr(part, content)
    return memory.getvalue()


@st.composite
def _table(draw) -> bytes:
    mark = draw(st.sampled_from(",;\t"))
    width = draw(st.integers(1, 14))
    rows = [draw(st.lists(st.sampled_from(_HEADINGS), min_size=width, max_size=width, unique=True))]
    rows += draw(st.lists(st.lists(_CELLS, min_size=width, max_size=width), max_size=4))
    quoted = [mark.join('"' + cell.replace('"', '""') + '"' for cell in row) for row in rows]
    return "\n".join(quoted).encode("utf-8", "surrogatepass")


_VALUES = st.one_of(
    st.none(),
    st.booleans(),
    st.integers(),
    st.floats(),
    st.text(max_size=4),
    st.just("MonoSi"),
    st.just("Three"),
)
_UNITS = st.sampled_from(
    (
        "V",
        "kV",
        "A",
        "W",
        "kW",
        "VA",
        "mm",
        "Cel",
        "F",
        "percent_per_Cel",
        "V_per_Cel",
        "decimal_percent",
        "",
        7,
        None,
    )
)


def _tree(node):
    """The shape of a sound document with random values, units and losses."""
    if isinstance(node, dict) and "Value" in node:
        return st.one_of(
            st.just(node), st.builds(lambda v, u: {"Value": v, "Unit": u}, _VALUES, _UNITS), _VALUES
        )
    if isinstance(node, dict):
        return st.fixed_dictionaries({}, optional={k: _tree(v) for k, v in node.items()})
    if isinstance(node, list):
        return st.one_of(st.tuples(*map(_tree, node)).map(list), st.lists(_VALUES, max_size=2))
    return st.one_of(st.just(node), _VALUES)


_DOCUMENTS = _tree(json.loads(_SOUND["json"])).map(lambda tree: json.dumps(tree).encode())

#: Name and content of a file.
files = st.one_of(
    st.tuples(st.just("a.csv"), st.one_of(_damaged(_SOUND["csv"]), _table(), st.binary(max_size=40))),
    st.tuples(st.just("a.toml"), st.one_of(_damaged(_SOUND["toml"]), st.binary(max_size=40))),
    st.tuples(st.just("a.json"), st.one_of(_damaged(_SOUND["json"]), _DOCUMENTS)),
    st.tuples(st.just("a.xlsx"), st.one_of(_damaged(_SOUND["xlsx"]), _damaged_workbook())),
)


def check(folder: Path, catalog: Catalog, name: str, content: bytes) -> bool:
    """Read and load a file; tell whether it was taken.

    Raises
    ------
    AssertionError
        If the refusal is no single line about the file, or the catalog holds something else than all or nothing.
    Exception
        Whatever reading or loading raised that it should not.
    """
    path = folder / name
    path.write_bytes(content)
    before = {kind: catalog.names(kind) for kind in ("module", "inverter")}
    try:
        found = read_sheets(path, settle=ColumnMap.confirmed)
        report = catalog.load(found.modules, found.inverters)
    except CatalogError as problem:
        told = [line for line in str(problem).split("\n") if not line.startswith("  ... and ")]
        assert len(told) == 1 or all(line.startswith(str(path)) for line in told), str(problem)
        assert {kind: catalog.names(kind) for kind in before} == before
        return False
    assert report.new + report.changed + report.unchanged == len(found.modules) + len(found.inverters)
    kept = {(type(r), r.maker, r.model): r for r in [*catalog.modules(), *catalog.inverters()]}
    for record in [*found.modules, *found.inverters]:
        assert kept[type(record), record.maker, record.model].source.name
    return True
