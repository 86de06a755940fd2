"""The gate card: two charts of height against speed, the figures, assumptions and cautions on one A5 sheet."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.backends.backend_pdf import FigureCanvasPdf
from matplotlib.figure import Figure
from matplotlib.lines import Line2D

from render.decide.gate_sheet import GateSheet
from render.decide.gates import Gate
from render.files import whole_file
from render.frames import Array
from render.output import gate_words as words
from render.output.ink import font, wrap_text
from render.output.words import CAUTION, KNOT_MPS, Units, seconds

A5_INCH = (148.0 / 25.4, 210.0 / 25.4)
DPI = 200
INK, QUIET, RULE = "#11151a", "#5a6570", "#c9d0d6"
BLUE, ORANGE, VERMILION = "#0072b2", "#e69f00", "#d55e00"  # Okabe and Ito, as ink.py
TONES = {"short": VERMILION, "none": VERMILION, "level": INK, "over": INK}
LEFT, RIGHT = 0.065, 0.955
MEASURE = 10.0  # texts are measured this much larger than they are set, since fonts are measured in whole pixels


def gate_figure(sheet: GateSheet) -> Figure:
    """The card as a figure of A5 size."""
    figure = Figure(figsize=A5_INCH, dpi=DPI, facecolor="white")
    y = _say(figure, LEFT, 0.975, sheet.scene.title, 9.5, weight="bold") - 0.002
    y = _say(figure, LEFT, y, f"Least heights from which any freeze of the lead's stabilator leaves "
             f"{words.wanted(sheet).replace(' left', '', 1)}", 6.8, colour=QUIET) - 0.007
    for name in sheet.gates:
        text, tone = words.headline(sheet, name)
        y = _say(figure, LEFT, y, text, 11.5, weight="bold", colour=TONES[tone]) - 0.001
    width = 0.395
    for i, name in enumerate(sheet.gates):
        axes = figure.add_axes((LEFT + 0.04 + i * (width + 0.088), 0.583, width - 0.022, y - 0.030 - 0.583))
        draw_gate(axes, sheet, name, first=i == 0)
        _figures(figure, sheet, name, LEFT + i * (width + 0.088), 0.534)
    _rule(figure, 0.386)
    y = 0.377
    for head, lines in words.extras(sheet):
        figure.text(LEFT, y, head, fontsize=6.4, weight="bold", color=INK, va="top", linespacing=1.25)
        for text in lines:
            y = _say(figure, LEFT + 0.135, y, text, 6.4)
        y -= 0.005
    y -= 0.002
    _rule(figure, y)
    y -= 0.008
    for text in words.assumptions(sheet):
        y = _say(figure, LEFT, y, text, 5.7, colour=QUIET) - 0.0015
    _say(figure, LEFT, 0.018, CAUTION, 6.4, weight="bold", bottom=True)
    return figure


def _rule(figure: Figure, y: float) -> None:
    figure.add_artist(Line2D([LEFT, RIGHT], [y, y], color=RULE, linewidth=0.8))


def _say(figure: Figure, x: float, y: float, text: str, size: float, *, weight: str = "normal", colour: str = INK,
         bottom: bool = False, right: float = RIGHT) -> float:
    """Write text, broken where it would pass ``right``, from its top (or bottom) at y; returns the y below it."""
    face = font(size * MEASURE, bold=weight == "bold")
    lines = wrap_text(text, face, (right - x) * A5_INCH[0] * 72.0 * MEASURE)
    figure.text(x, y, "\n".join(lines), fontsize=size, weight=weight, color=colour, va="bottom" if bottom else "top",
                linespacing=1.25)
    return y - len(lines) * size * 1.32 / 72.0 / A5_INCH[1]


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
    low, high = axes.get_ylim()
    above = bool(np.nanmean(likely) >= np.nanmean(briefed)) if np.any(np.isfinite(likely)) else True
    for line, text, colour, weight, over in (
        (likely, f"any freeze leaves {seconds(sheet.want_s)}", BLUE, "bold", above),
        (briefed, "closes, briefed pull", INK, "normal", not above),
        (limit, "closes, limit pull", QUIET, "normal", True),
    ):
        at = 4
        if not (np.isfinite(line[at]) and np.isfinite(line[at + 24])):
            continue
        (x0, y0), (x1, y1) = axes.transData.transform([(x[at], line[at]), (x[at + 24], line[at + 24])])
        slope = float(np.degrees(np.arctan2(y1 - y0, x1 - x0)))
        axes.annotate(text, (x[at], line[at]), (0, 3 if over else -3), textcoords="offset points", fontsize=6.4,
                      color=colour, weight=weight, rotation=slope, rotation_mode="anchor", ha="left",
                      va="bottom" if over else "top")
    axes.annotate("this loop", (own_x, own), (7, -3), textcoords="offset points", fontsize=7.0, color=tone,
                  weight="bold", va="top", ha="left", zorder=6,
                  bbox={"facecolor": "white", "edgecolor": "none", "alpha": 0.8, "pad": 0.5})
    width = late - early
    if np.any(width[np.isfinite(width)] > 0.06 * (high - low)):
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
        _say(figure, x, y - 0.0235, note, 5.9, colour=BLUE, right=x + 0.41)


def write_gate_card(sheet: GateSheet, stem: str | Path, *, force: bool = False) -> tuple[Path, Path]:
    """Write the card as ``<stem>.png`` and ``<stem>.pdf``, A5; returns their paths. Raises as ``whole_file`` does."""
    made = Path(f"{stem}.png"), Path(f"{stem}.pdf")
    figure = gate_figure(sheet)
    with whole_file(made[0], force=force) as png, whole_file(made[1], force=force) as pdf:
        FigureCanvasAgg(figure).print_figure(str(png), dpi=DPI, facecolor="white")
        FigureCanvasPdf(figure).print_figure(str(pdf), facecolor="white", metadata={
            "Title": f"Gates: {sheet.scene.title}", "Subject": CAUTION, "CreationDate": None})
    return made
