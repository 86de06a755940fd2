"""The gate card: two charts of height against speed, the figures, assumptions and cautions on one A5 sheet."""

from __future__ import annotations

import textwrap
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.backends.backend_pdf import FigureCanvasPdf
from matplotlib.figure import Figure

from render.decide.gate_sheet import GateSheet
from render.decide.gates import Gate
from render.files import whole_file
from render.frames import Array
from render.output import gate_words as words
from render.output.words import CAUTION, KNOT_MPS, Units, seconds

A5_INCH = (148.0 / 25.4, 210.0 / 25.4)
DPI = 200
INK, QUIET, RULE = "#11151a", "#5a6570", "#c9d0d6"
BLUE, ORANGE, VERMILION = "#0072b2", "#e69f00", "#d55e00"  # Okabe and Ito, as ink.py
TONES = {"short": VERMILION, "none": VERMILION, "level": INK, "over": INK}
LEFT, RIGHT = 0.075, 0.955


def gate_figure(sheet: GateSheet) -> Figure:
    """The card as a figure of A5 size."""
    figure = Figure(figsize=A5_INCH, dpi=DPI, facecolor="white")
    _say(figure, LEFT, 0.968, sheet.scene.title, 9.5, weight="bold", wide=66)
    _say(figure, LEFT, 0.945, f"Gates that leave {words.wanted(sheet)}, wherever from there on the lead's stabilator "
         "freezes", 7.2, colour=QUIET, wide=100)
    for i, name in enumerate(sheet.gates):
        text, tone = words.headline(sheet, name)
        _say(figure, LEFT, 0.921 - 0.024 * i, text, 11.0, weight="bold", colour=TONES[tone], wide=70)
    width = 0.395
    for i, name in enumerate(sheet.gates):
        axes = figure.add_axes((LEFT + 0.035 + i * (width + 0.088), 0.565, width - 0.012, 0.285))
        draw_gate(axes, sheet, name, first=i == 0)
        _figures(figure, sheet, name, LEFT + i * (width + 0.088), 0.517)
    line = figure.add_artist(_rule(0.352))
    del line
    y = 0.340
    for text in (*(words.held_words(sheet, name) for name in sheet.gates), words.base_words(sheet),
                 words.float_words(sheet), words.day_words(sheet)):
        y = _say(figure, LEFT, y, text, 6.6, wide=112) - 0.005
    figure.add_artist(_rule(y - 0.001))
    y -= 0.011
    for text in words.assumptions(sheet):
        y = _say(figure, LEFT, y, text, 5.4, colour=QUIET, wide=138) - 0.0015
    _say(figure, LEFT, 0.024, CAUTION, 6.2, weight="bold", wide=125, bottom=True)
    return figure


def _rule(y: float) -> Any:
    from matplotlib.lines import Line2D

    return Line2D([LEFT, RIGHT], [y, y], color=RULE, linewidth=0.8)


def _say(figure: Figure, x: float, y: float, text: str, size: float, *, weight: str = "normal", colour: str = INK,
         wide: int, bottom: bool = False) -> float:
    """Write text broken at ``wide`` letters from its top (or bottom) at y; returns the y below it."""
    lines = textwrap.wrap(text, wide)
    figure.text(x, y, "\n".join(lines), fontsize=size, weight=weight, color=colour, va="bottom" if bottom else "top",
                linespacing=1.25)
    return y - len(lines) * size * 1.25 / 72.0 / A5_INCH[1]


def draw_gate(axes: Axes, sheet: GateSheet, name: str, *, first: bool) -> None:
    """One gate: the heights that close the loop and the band that leaves the wanted seconds, against speed."""
    units, gate = Units(sheet.scene.film.units), sheet.gates[name]
    to_speed = (lambda v: v / KNOT_MPS) if units.name == "feet" else (lambda v: v * 3.6)
    fine, curve = _curves(gate)
    x = to_speed(fine)
    early, likely, late = (units.length_value(1.0) * curve(gate.noticed_m[:, i]) for i in range(3))
    briefed, limit = (units.length_value(1.0) * curve(v) for v in (gate.briefed_m, gate.limit_m))
    axes.fill_between(x, early, late, color=BLUE, alpha=0.22, linewidth=0)
    axes.plot(x, likely, color=BLUE, linewidth=2.4)
    axes.plot(x, briefed, color=INK, linewidth=1.3)
    axes.plot(x, limit, color=QUIET, linewidth=1.1, linestyle=(0, (4, 2)))
    own_x = float(to_speed(gate.speed_mps[gate.flown]))
    own = units.length_value(gate.flown_height_m)
    tone = TONES[words.headline(sheet, name)[1]]
    need = units.length_value(float(gate.noticed_m[gate.flown, 1]))
    axes.plot([own_x], [own], marker="D", color=tone, markersize=7, markeredgecolor="white", markeredgewidth=1.0,
              zorder=5)
    values = np.concatenate([v[np.isfinite(v)] for v in (early, late, briefed, limit, np.array([own]))])
    low, high = float(values.min()), float(values.max())
    pad = 0.10 * (high - low)
    axes.set_ylim(low - 0.7 * pad, high + 1.1 * pad)
    if np.isfinite(need) and need - own > 0.05 * (high - low):
        axes.annotate("", xy=(own_x, need), xytext=(own_x, own), zorder=4,
                      arrowprops={"arrowstyle": "-|>", "color": tone, "linewidth": 1.4, "shrinkA": 4, "shrinkB": 1})
    span = x[-1] - x[0]
    axes.set_xlim(x[0] - 0.03 * span, x[-1] + 0.03 * span)
    _labels(axes, sheet, gate, x, (early, likely, late, briefed, limit), own_x, own, tone)
    axes.set_title(f"At the {words.PLACES[name]}" if name == "top" else f"At {words.PLACES[name]}", fontsize=8.5,
                   weight="bold", loc="left", color=INK, pad=5)
    axes.set_xlabel(f"calibrated speed there, {units.speed_unit}", fontsize=6.4, color=QUIET, labelpad=2)
    axes.set_ylabel(f"height above the field, {units.length_unit}" if first else "", fontsize=6.4, color=QUIET,
                    labelpad=2)
    axes.tick_params(labelsize=6.2, colors=QUIET, length=2, pad=2)
    axes.yaxis.set_major_formatter(lambda value, _: f"{value:,.0f}")
    axes.locator_params(axis="y", nbins=6)
    axes.locator_params(axis="x", nbins=5)
    axes.grid(color=RULE, linewidth=0.4)
    axes.set_axisbelow(True)
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)
    for side in ("left", "bottom"):
        axes.spines[side].set_color(RULE)


def _curves(gate: Gate) -> tuple[Array, Callable[[Array], Array]]:
    """Speeds close together, and a curve through the solved points; gaps stay gaps."""
    from scipy.interpolate import PchipInterpolator

    fine = np.linspace(gate.speed_mps[0], gate.speed_mps[-1], 81)

    def curve(values: Array) -> Array:
        known = np.isfinite(values)
        if np.sum(known) < 2:
            return np.full(fine.shape, np.nan)
        x = gate.speed_mps[known]
        inside = (fine >= x[0] - 1e-9) & (fine <= x[-1] + 1e-9)
        return np.where(inside, PchipInterpolator(x, values[known])(np.clip(fine, x[0], x[-1])), np.nan)

    return fine, curve


def _labels(axes: Axes, sheet: GateSheet, gate: Gate, x: Array, lines: tuple[Array, ...], own_x: float, own: float,
            tone: str) -> None:
    """Words on the lines themselves, each in its line's colour, kept apart in height."""
    early, likely, late, briefed, limit = lines
    at = 2
    said = [(float(likely[at]), f"any freeze leaves {seconds(sheet.want_s)}", BLUE, "bold"),
            (float(briefed[at]), "closes, briefed pull", INK, "normal"),
            (float(limit[at]), "closes, limit pull", QUIET, "normal")]
    low, high = axes.get_ylim()
    last = -np.inf
    for y, text, colour, weight in sorted((s for s in said if np.isfinite(s[0])), key=lambda s: s[0]):
        place = max(y + 0.012 * (high - low), last + 0.052 * (high - low))
        last = place
        axes.text(x[at], place, text, fontsize=6.4, color=colour, weight=weight, va="bottom", ha="left",
                  bbox={"facecolor": "white", "edgecolor": "none", "alpha": 0.75, "pad": 0.6})
    axes.text(own_x + 0.03 * (x[-1] - x[0]), own - 0.015 * (high - low), "this loop", fontsize=7.0, color=tone,
              weight="bold", va="top", ha="left")
    if np.nanmax(late - early) > 0.06 * (high - low):
        for line, text, side in ((early, "early", "top"), (late, "late", "bottom")):
            axes.text(x[-1], line[-1] + (-0.008 if side == "top" else 0.008) * (high - low), text, fontsize=5.6,
                      color=BLUE, va=side, ha="right")


def _figures(figure: Figure, sheet: GateSheet, name: str, x: float, y: float) -> None:
    """The gate's figures at the speed the loop has there, as a small table."""
    units, gate = Units(sheet.scene.film.units), sheet.gates[name]
    speed = units.speed(float(gate.speed_mps[gate.flown]))
    figure.text(x, y, f"At {speed}", fontsize=6.8, color=QUIET, va="top")
    for what, value in words.rows(sheet, name):
        y -= 0.0205
        last = what.startswith("any freeze")
        if last:
            figure.text(x, y, what, fontsize=6.4, color=BLUE, va="top")
            y -= 0.0195
            figure.text(x, y, value, fontsize=9.2, color=BLUE, va="top", weight="bold")
        else:
            figure.text(x, y, what, fontsize=6.4, color=INK, va="top")
            figure.text(x + 0.395, y, value, fontsize=7.4, color=INK, va="top", ha="right", weight="bold")
    note = gate.none or ("from there on every freeze ends above the floor by itself" if words.jump(gate) else "")
    if note:
        figure.text(x, y - 0.0235, "\n".join(textwrap.wrap(note, 58)), fontsize=5.9, color=BLUE, va="top")


def write_gate_card(sheet: GateSheet, stem: str | Path, *, force: bool = False) -> tuple[Path, Path]:
    """Write the card as ``<stem>.png`` and ``<stem>.pdf``, A5; returns their paths. Raises as ``whole_file`` does."""
    made = Path(f"{stem}.png"), Path(f"{stem}.pdf")
    figure = gate_figure(sheet)
    with whole_file(made[0], force=force) as png, whole_file(made[1], force=force) as pdf:
        FigureCanvasAgg(figure).print_figure(str(png), dpi=DPI, facecolor="white")
        FigureCanvasPdf(figure).print_figure(str(pdf), facecolor="white", metadata={
            "Title": f"Gates: {sheet.scene.title}", "Subject": CAUTION, "CreationDate": None})
    return made
