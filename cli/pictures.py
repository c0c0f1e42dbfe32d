"""Pictures of a result as SVG: a string in the climate, wirings as a grid, energy by module count.

What a picture shows comes from the engine; nothing here decides whether something fits. Meaning is carried by
markers, letters, dashes and words; colour (Okabe and Ito 2008, told apart also without red-green vision)
repeats it.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from cli import facts
from cli.drawing import ACCENT, AMBER, INK, MUTED, RULE, VERMILION, figure, spread, styled, svg_of
from cli.series import EnergyByCount, Limit, StringInClimate, WiringGrid, volts_words

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure
    from matplotlib.patches import Rectangle


@dataclass(frozen=True, slots=True)
class Picture:
    """A picture: its SVG element, title, and what it shows in words (also the text alternative)."""

    svg: str
    title: str
    words: str


def draw_climate(s: StringInClimate) -> Picture:
    """Voc and Vmp of the string against air temperature, inside the limits that hold for it."""
    with styled():
        fig = figure(7.2, 4.3)
        ax = fig.add_axes((0.085, 0.12, 0.605, 0.83))
        limits = _near(s)
        ax.set_xlim(s.ambient_c[0], s.ambient_c[-1])
        ax.set_ylim(*_heights(s, limits))
        ax.axhspan(*s.window_v, color=ACCENT, alpha=0.08, lw=0)
        notes = []
        for limit in limits:
            colour = VERMILION if limit.maximum and not limit.name.startswith("MPPT") else MUTED
            ax.axhline(limit.volts, color=colour, lw=1.2, ls="-" if limit.recorded else (0, (2, 2)))
            notes.append((limit.volts, f"{limit.name} {volts_words(limit)}", colour))
        ax.plot(s.ambient_c, s.voc_v, color=ACCENT, lw=2)
        ax.plot(s.ambient_c, s.vmp_v, color=INK, lw=2, ls=(0, (5, 1.6)))
        _outside(ax, s)
        close = s.design_high_c - s.design_low_c < 0.35 * float(s.ambient_c[-1] - s.ambient_c[0])
        _design_point(ax, s.design_low_c, s.voc_cold_v, "design low", "right" if close else "center")
        _design_point(ax, s.design_high_c, s.vmp_hot_v, "design high", "left" if close else "center")
        notes += [
            (float(s.voc_v[-1]), f"Voc of {s.longest} in series, dawn", ACCENT),
            (float(s.vmp_v[-1]), f"Vmp of {s.shortest} in series, full sun", INK),
        ]
        _margin_notes(ax, notes)
        ax.set_xlabel("air temperature [°C]")
        ax.set_ylabel("string voltage [V]")
        return _picture(fig, "climate", "The string in the climate", s.words)


def _picture(fig: Figure, key: str, title: str, words: str) -> Picture:
    return Picture(svg_of(fig, key, title, words), title, words)


def _near(s: StringInClimate) -> list[Limit]:
    """Limits that are not so far above the string that they would press it flat; the words name all."""
    return [limit for limit in s.limits if limit.volts <= 1.7 * max(float(s.voc_v.max()), s.window_v[0])]


def _heights(s: StringInClimate, limits: list[Limit]) -> tuple[float, float]:
    volts = [float(s.voc_v.max()), float(s.vmp_v.min()), *(limit.volts for limit in limits)]
    rise = (max(volts) - min(volts)) * 0.08
    return max(0.0, min(volts) - rise), max(volts) + 1.6 * rise


_PLATE = {"boxstyle": "square,pad=0.15", "fc": "white", "ec": "none", "alpha": 0.85}


def end_words(edge: float, cold: bool) -> str:
    """One end of a climate window as text, in whole degrees on the safe side, as tables and sentences have it."""
    return f"{facts.whole(edge, cold)} °C".replace("-", "−")


def _design_point(ax: Axes, at_c: float, volts: float, name: str, align: str) -> None:
    """The design temperature named above the frame, and the voltage at it beside the curve."""
    ax.axvline(at_c, color=INK, lw=0.8, ls=(0, (1, 2)))
    ax.plot([at_c], [volts], "o", color=INK, ms=6, zorder=5)
    ax.annotate(
        f"{name} {at_c:g} °C".replace("-", "−"),
        (at_c, 1),
        (0, 3),
        xycoords=("data", "axes fraction"),
        textcoords="offset points",
        ha=align,
        va="bottom",
        fontsize=8,
    )
    ax.annotate(
        f"{volts:.0f} V",
        (at_c, volts),
        (5, 5),
        textcoords="offset points",
        va="bottom",
        fontsize=8.5,
        weight="bold",
        bbox=_PLATE,
        zorder=6,
    )


def _outside(ax: Axes, s: StringInClimate) -> None:
    """Hatch the temperatures at which the option no longer holds."""
    left, right = s.ambient_c[0], s.ambient_c[-1]
    top = ax.get_ylim()[1]
    for begin, end, edge in ((left, s.coldest_c, s.coldest_c), (s.hottest_c, right, s.hottest_c)):
        if edge is None or not left < edge < right:
            continue
        ax.axvspan(begin, end, facecolor="none", edgecolor=RULE, hatch="///", lw=0)
        ax.axvline(edge, color=MUTED, lw=1)
        cold = edge == s.coldest_c
        ax.annotate(
            f"{'holds from' if cold else 'holds up to'} {end_words(edge, cold)}",
            (edge, top),
            (4 if cold else -4, -4),
            textcoords="offset points",
            ha="left" if cold else "right",
            va="top",
            fontsize=8,
            bbox=_PLATE,
            zorder=6,
        )


def _margin_notes(ax: Axes, notes: list[tuple[float, str, str]]) -> None:
    """Names of lines at the right margin, moved apart where they would overlap."""
    low, high = ax.get_ylim()
    notes = sorted(notes)
    for (at, text, colour), y in zip(
        notes, spread([n[0] for n in notes], (high - low) * 0.052, low, high), strict=True
    ):
        ax.annotate(
            text,
            (1, at),
            (1.035, (y - low) / (high - low)),
            xycoords=("axes fraction", "data"),
            textcoords="axes fraction",
            fontsize=8,
            color=colour,
            va="center",
            annotation_clip=False,
            arrowprops={"arrowstyle": "-", "color": colour, "lw": 0.6, "shrinkA": 0, "shrinkB": 0},
        )


#: Letter, fill and colour of each outcome in the grid.
_CELLS = {
    "fits": ("F", ACCENT, "white"),
    "to-confirm": ("c", AMBER, INK),
    "ratio": ("r", "#E4E1D8", INK),
    "no": ("×", "none", MUTED),
}

GRID_KEY = (
    "F fits; c to confirm; r the ratings would allow it, but the DC/AC ratio is outside the window;"
    " × does not fit."
)


def draw_grid(g: WiringGrid) -> Picture:
    """String length against number of strings, one letter for the verdict of each wiring."""
    with styled():
        rows, columns = len(g.lengths), len(g.strings)
        cell = min(0.4, 4.5 / columns)
        wide, tall = 7.2, rows * 0.27 + 0.8
        fig = figure(wide, tall)
        ax = fig.add_axes((0.62 / wide, 0.5 / tall, columns * cell / wide, rows * 0.27 / tall))
        ax.set_xlim(-0.5, columns - 0.5)
        ax.set_ylim(-0.5, rows - 0.5)
        for r in range(rows):
            for c in range(columns):
                letter, fill, colour = _CELLS[g.cells[r][c]]
                if fill != "none":
                    ax.add_patch(_square(c, r, facecolor=fill, edgecolor="white", linewidth=1.5))
                weight = "bold" if letter == "F" else "normal"
                ax.text(
                    c, r, letter, ha="center", va="center_baseline", fontsize=8.5, color=colour, weight=weight
                )
            if g.row_notes[r]:
                ax.text(columns - 0.3, r, g.row_notes[r], va="center_baseline", fontsize=7.5, color=MUTED)
        if g.chosen is not None:
            ax.add_patch(_square(*g.chosen, facecolor="none", edgecolor=INK, linewidth=2, zorder=5))
        step = max(1, -(-columns // 16))
        ax.set_xticks(range(0, columns, step), [str(n) for n in g.strings[::step]])
        ax.set_yticks(range(rows), [str(n) for n in g.lengths])
        ax.tick_params(length=0)
        for side in ax.spines.values():
            side.set_visible(False)
        ax.set_xlabel("strings on one inverter", loc="left")
        ax.annotate(
            "modules in series", (0, 1), (-38, 5), xycoords="axes fraction", textcoords="offset points"
        )
        return _picture(fig, "grid", "Which wirings the ratings allow", g.words)


def _square(column: float, row: float, **style: object) -> Rectangle:
    from matplotlib.patches import Rectangle

    return Rectangle((column - 0.5, row - 0.5), 1, 1, **style)  # type: ignore[arg-type]


def draw_energy(e: EnergyByCount) -> Picture:
    """Yearly energy, and what of it is clipped, against the number of modules."""
    with styled():
        fig = figure(7.2, 4.0)
        above = fig.add_axes((0.1, 0.45, 0.87, 0.53))
        below = fig.add_axes((0.1, 0.13, 0.87, 0.24), sharex=above)
        for ax, values, unit in (
            (above, e.yearly_kwh, "yearly energy [kWh]"),
            (below, e.clipping_pct, "clipped [%]"),
        ):
            ax.plot(e.counts, values, color=RULE, lw=1.2, zorder=1)
            for sure, marker, fill, name in (
                (True, "o", ACCENT, "fits"),
                (False, "s", "white", "to confirm"),
            ):
                some = [k for k, f in enumerate(e.sure) if f is sure]
                if some:
                    ax.plot(
                        [e.counts[k] for k in some],
                        [values[k] for k in some],
                        marker,
                        ms=5,
                        mfc=fill,
                        mec=ACCENT if sure else AMBER,
                        mew=1.4,
                        label=name,
                        ls="none",
                        zorder=3,
                        clip_on=False,
                    )
            ax.set_ylabel(unit)
            if e.chosen is not None:
                ax.plot(
                    [e.chosen],
                    [values[e.counts.index(e.chosen)]],
                    "o",
                    ms=12,
                    mfc="none",
                    mec=INK,
                    mew=1.4,
                    zorder=4,
                    label=f"option 1: {e.chosen:,} modules",
                    ls="none",
                )
            ax.yaxis.set_major_formatter(lambda v, _: f"{v:,.0f}" if v >= 10 or v == int(v) else f"{v:.1f}")
        below.axhline(e.cap_pct, color=VERMILION, lw=1, dashes=(4, 2))
        below.annotate(
            f"cap {e.cap_pct:g} %",
            (1, e.cap_pct),
            (-2, 2),
            xycoords=("axes fraction", "data"),
            textcoords="offset points",
            ha="right",
            va="bottom",
            fontsize=8,
            color=VERMILION,
        )
        below.set_ylim(bottom=0, top=max(max(e.clipping_pct), e.cap_pct) * 1.25)
        above.legend(loc="upper left", frameon=False, fontsize=8)
        above.tick_params(labelbottom=False)
        below.xaxis.get_major_locator().set_params(integer=True)
        below.xaxis.set_major_formatter(lambda v, _: f"{v:,.0f}")
        below.set_xlabel("modules on one inverter")
        return _picture(fig, "energy", "Energy and clipping by number of modules", e.words)
