"""The grid of what is in stock as a picture: a mark and a letter per pair, so that colour only helps."""

from __future__ import annotations

import io
from typing import IO, TYPE_CHECKING, Any

from cli.drawing import ACCENT, AMBER, INK, MUTED, RULE, figure, styled
from cli.grid_files import letter
from cli.grid_screen import span
from matcher.checks import Verdict

if TYPE_CHECKING:
    from cli.grid_files import Shown

# Light tints of blue and amber (Okabe and Ito 2008), under dark letters; the second one is hatched as well.
_FILL = {Verdict.FITS: "#CFE4F3", Verdict.TO_CONFIRM: "#FBE3B0"}
_EDGE = {Verdict.FITS: ACCENT, Verdict.TO_CONFIRM: AMBER}

_CELL = (0.82, 0.42)  # inch


def draw(shown: Shown, stream: IO[Any], form: str) -> None:
    """Draw the picture into a stream: of text for ".svg", of bytes for ".png"."""
    data = io.BytesIO()
    with styled():
        fig = _figure(shown)
        fig.patch.set_visible(True)
        fig.patch.set_facecolor("white")
        metadata = {"Title": "Modules and inverters in stock that go together"}
        if form == ".svg":
            metadata |= {"Date": None}
        fig.savefig(data, format=form[1:], dpi=150, metadata=metadata, bbox_inches="tight", pad_inches=0.15)
    stream.write(data.getvalue() if form == ".png" else data.getvalue().decode("utf-8"))


def _figure(shown: Shown) -> Any:
    from matplotlib.patches import Rectangle

    grid = shown.grid
    columns, lines = len(grid.inverters), len(grid.modules)
    fig = figure(columns * _CELL[0] + 3.0, lines * _CELL[1] + 2.6)
    axes = fig.add_axes((0.0, 0.0, 1.0, 1.0))
    axes.set_axis_off()
    axes.set_xlim(-3.6, columns)
    axes.set_ylim(lines + 1.0, -4.6)
    for m, module in enumerate(grid.modules):
        axes.text(-0.1, m + 0.5, f"{module.name} ({shown.pieces[module.id]:,})", ha="right", va="center")
        for i in range(columns):
            pair = grid.pairs.get((m, i))
            if pair is None:
                axes.add_patch(Rectangle((i, m), 1, 1, facecolor="none", edgecolor=RULE, linewidth=0.5))
                axes.text(i + 0.5, m + 0.5, "\u2013", ha="center", va="center", color=MUTED)
                continue
            hatch = "////" if pair.verdict is Verdict.TO_CONFIRM else None
            axes.add_patch(Rectangle((i, m), 1, 1, facecolor=_FILL[pair.verdict], edgecolor="white", linewidth=0.5))
            # The hatch is a stripe at the edge: over the whole cell it would make the words hard to read.
            axes.add_patch(Rectangle((i + 0.02, m + 0.04), 0.1, 0.92, facecolor=_FILL[pair.verdict],
                                     edgecolor=_EDGE[pair.verdict], hatch=hatch, linewidth=0.8))  # fmt: skip
            axes.text(i + 0.56, m + 0.34, f"{letter(pair.verdict)}  {pair.best.dc_ac_ratio:.2f}", ha="center",
                      va="center", fontweight="bold")  # fmt: skip
            axes.text(i + 0.56, m + 0.72, span(pair), ha="center", va="center", fontsize=7.5)
    for i, inverter in enumerate(grid.inverters):
        axes.text(i + 0.35, -0.15, f"{inverter.name} ({shown.pieces[inverter.id]:,})", rotation=40, ha="left", va="bottom",
                  rotation_mode="anchor", color=INK)  # fmt: skip
    site = grid.fit.request.site
    axes.text(-3.6, lines + 0.55, "F fits, C to confirm (hatched), \u2013 no; best DC/AC ratio, and below it the modules on"
              f" one inverter. {site.design_low_c:g} to {site.design_high_c:g} \u00b0C, {site.mounting}.",
              va="center", fontsize=8, color=MUTED)  # fmt: skip
    return fig
