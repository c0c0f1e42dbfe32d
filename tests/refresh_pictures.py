"""Draw the pictures of the documents anew, from the demo: ``python tests/refresh_pictures.py`` in the root."""

from __future__ import annotations

import sys
import tempfile
from pathlib import Path

ROOT = Path(__file__).parent.parent
sys.path.insert(0, str(ROOT))

# The SVG stands by itself here, on white, with a font that most machines have.
_ROOT_STYLE = 'style="background: white; font-family: sans-serif"'


def main() -> None:
    """Write docs/climate.svg and docs/energy.svg."""
    from catalog.store import Catalog
    from cli.asking import request_of
    from cli.choosing import choose_inverter, choose_module
    from cli.main import run
    from cli.pictures import draw_climate, draw_energy
    from cli.series import energy_by_count, string_in_climate
    from cli.years import site_year
    from matcher.fit import fit

    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder, "demo.sqlite")
        run(["demo", "--keep", str(path)])
        with Catalog.open(path) as catalog:
            module = choose_module(catalog, "klassik 275p")
            inverter = choose_inverter(catalog, "viola 5")
            site = catalog.site("Butterfield Barn")
            request = request_of(site, "0.6..1.8", None, 2.0, "iec-62548", False, "least-inverter", True)
            found = fit([module], [inverter], request, site_year(catalog, site, module).year)
    option = next(o for o in found.options() if o.label == "1x12 | 1x12")
    for name, picture in (
        ("climate", draw_climate(string_in_climate(found, option))),
        ("energy", draw_energy(energy_by_count(found, option))),
    ):
        svg = picture.svg.replace("<svg ", f"<svg {_ROOT_STYLE} ", 1)
        (ROOT / "docs" / f"{name}.svg").write_text(f"{svg}\n", encoding="utf-8")
        print(f"docs/{name}.svg: {picture.words}")


if __name__ == "__main__":
    main()
