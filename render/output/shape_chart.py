"""The chart of a search for a pull: the load factor before and after, what each freeze leaves, and the trade."""

from __future__ import annotations

import math
from collections.abc import Callable
from pathlib import Path

import numpy as np
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.backends.backend_svg import FigureCanvasSVG
from matplotlib.figure import Figure
from matplotlib.ticker import MaxNLocator

from render.decide.shape import LIKELY, Frozen
from render.decide.shape_search import Shape, Trade
from render.files import whole_file
from render.frames import Array
from render.output.ink import font, wrap_text
from render.output.shape_words import chosen, headline, late_words
from render.output.words import CAUTION, Units

INCH = (13.0, 7.4)
DPI = 120
INK, QUIET, RULE = "#11151a", "#5a6570", "#c9d0d6"
BEFORE, AFTER, TOO_LATE = "#d55e00", "#0072b2", "#fbeee6"  # Okabe and Ito, as ink.py; a tint of the first
MEASURE = 10.0
ROOM_S = 1.4  # band at the foot for freezes that clear by themselves


def shape_figure(shape: Shape) -> Figure:
    """The chart as a figure."""
    figure = Figure(figsize=INCH, dpi=DPI, facecolor="white")
    best = chosen(shape)
    y = _say(figure, 0.03, 0.965, headline(shape), 16.0, weight="bold") - 0.004
    _say(figure, 0.03, y, f"{shape.job.scene.title.rstrip('.')}. Freeze of the lead's stabilator anywhere on the way "
         "down; entry, top and base of the loop are the same.", 9.5, colour=QUIET)
    _demand(figure.add_axes((0.055, 0.175, 0.27, 0.605)), shape, best)
    _lateness(figure.add_axes((0.385, 0.175, 0.365, 0.605)), shape, best)
    _trade(figure.add_axes((0.81, 0.175, 0.17, 0.605)), shape)
    _say(figure, 0.03, 0.062, CAUTION, 9.0, weight="bold")
    _say(figure, 0.03, 0.034, "Bands: from the early to the late observer; lines: the likely one. The worse slot of "
         "the formation. Other faults and other entries are not looked at.", 8.0, colour=QUIET)
    return figure


def _say(figure: Figure, x: float, y: float, text: str, size: float, *, weight: str = "normal",
         colour: str = INK) -> float:
    """Write text from its top at y, broken at the right margin; returns the y below it."""
    face = font(size * MEASURE, bold=weight == "bold")
    lines = wrap_text(text, face, (0.97 - x) * INCH[0] * 72.0 * MEASURE)
    figure.text(x, y, "\n".join(lines), fontsize=size, weight=weight, color=colour, va="top", linespacing=1.25)
    return y - len(lines) * size * 1.35 / 72.0 / INCH[1]


def _plain(axes: Axes, title: str, x_label: str, y_label: str) -> None:
    axes.set_title(title, fontsize=11.0, weight="bold", loc="left", color=INK, pad=9)
    axes.set_xlabel(x_label, fontsize=9.0, color=QUIET)
    axes.set_ylabel(y_label, fontsize=9.0, color=QUIET)
    axes.tick_params(labelsize=8.5, colors=QUIET, length=3)
    axes.grid(color=RULE, linewidth=0.5)
    axes.set_axisbelow(True)
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)
    for side in ("left", "bottom"):
        axes.spines[side].set_color(RULE)


def _loop_axis(axes: Axes) -> None:
    axes.set_xlim(178.0, 362.0)
    axes.set_xticks([180, 225, 270, 315, 360], ["180\ntop", "225", "270\nvertical\ndown", "315", "360\nlevel"])


def _demand(axes: Axes, shape: Shape, best: Trade | None) -> None:
    _plain(axes, "The pull", "", "load factor flown, g")
    pulls = [(shape.start_pull, BEFORE, "as it was", 2.0)]
    if best is not None and best.pull is not None:
        pulls.append((best.pull, AFTER, "found", 3.0))
    tops = []
    for pull, colour, name, width in pulls:
        x, n = np.degrees(pull.angle_rad), np.array(pull.flown_load)
        axes.plot(x, n, color=colour, linewidth=width)
        i = int(np.argmax(n))
        tops.append(n[i])
        axes.annotate(f"{name}\n{pull.load_factor:.1f} g", (x[i], n[i]), (0, 6), textcoords="offset points",
                      fontsize=9.5, weight="bold", color=colour, ha="center", va="bottom")
    _loop_axis(axes)
    axes.set_ylim(0.0, 1.22 * max(tops))


def _ends(frozen: Frozen) -> Array:
    """Latenesses for a chart, (F, O): clears and unknown as gaps, never as what lies above the chart."""
    late = np.where(np.isneginf(frozen.lateness_s), np.nan, frozen.lateness_s)
    return np.where(np.isposinf(late), 1e3, late)


def _lateness(axes: Axes, shape: Shape, best: Trade | None) -> None:
    _plain(axes, "How late, by where it freezes", "loop angle of the freeze, degrees",
           "s before or after the last pull")
    found = [(shape.start, BEFORE, "as it was")]
    if best is not None and best.frozen is not None:
        found.append((best.frozen, AFTER, "found"))
    known = np.concatenate([v[np.isfinite(v) & (v < 100.0)] for v in (_ends(f).ravel() for f, _, _ in found)])
    high = max(float(known.max()) if known.size else 1.0, 1.0) * 1.1 + 0.3
    low = min(float(known.min()) if known.size else 0.0, 0.0) - 0.4
    strip = (high - low) * 0.095 * len(found)
    axes.axhspan(0.0, high, color=TOO_LATE, zorder=0)
    axes.axhline(0.0, color=INK, linewidth=1.2)
    axes.text(361.0, high * 0.985, "TOO LATE", fontsize=9.5, weight="bold", color=BEFORE, ha="right", va="top")
    axes.text(361.0, -0.015 * (high - low), "in time", fontsize=9.5, color=QUIET, ha="right", va="top")
    for n, (frozen, colour, name) in enumerate(found):
        x = np.degrees(frozen.freeze_rad)
        early, likely, late = np.minimum(_ends(frozen), high + 1.0).T
        axes.fill_between(x, early, late, color=colour, alpha=0.2, linewidth=0)
        axes.plot(x, likely, color=colour, linewidth=2.6)
        if np.any(np.isfinite(likely)):
            i = int(np.nanargmax(likely))
            axes.plot([x[i]], [min(likely[i], high)], marker="o", color=colour, markersize=6)
            axes.annotate(f"{name}: {late_words(float(frozen.worst_s[LIKELY]))}", (x[i], min(likely[i], high)), (6, -6),
                          textcoords="offset points", fontsize=9.5, weight="bold", color=colour, va="top",
                          bbox={"facecolor": "white", "edgecolor": "none", "alpha": 0.75, "pad": 0.8})
        foot = low - strip * (n + 0.62) / len(found)
        _clearing(axes, x, frozen, foot, strip / len(found) * 0.55, colour, name)
    axes.set_ylim(low - strip * 1.05, high)
    ticks = [t for t in range(math.ceil(low), math.floor(high) + 1) if t % (2 if high - low > 7 else 1) == 0]
    axes.set_yticks(ticks, [f"{t:+d}" if t else "0" for t in ticks])
    _loop_axis(axes)


def _clearing(axes: Axes, x: Array, frozen: Frozen, y: float, height: float, colour: str, name: str) -> None:
    """A bar at the foot where a freeze clears the floor by itself."""
    half = np.diff(x, prepend=x[0], append=x[-1]) / 2.0
    for i in np.flatnonzero(frozen.clears):
        axes.barh(y, half[i] + half[i + 1], height, left=x[i] - half[i], color=colour, linewidth=0)
    clear = np.flatnonzero(frozen.clears)
    inside = clear.size > 0.5 * len(x)
    text = f"{name}: no freeze clears by itself"
    if clear.size:
        text = f"{name}: clears by itself" + ("" if inside else " only here \u2192")
    at = float(x[clear].mean()) if inside else 180.0
    axes.text(at, y, text, fontsize=8.5, weight="bold", color="white" if inside else colour,
              ha="center" if inside else "left", va="center")


def _trade(axes: Axes, shape: Shape) -> None:
    """The worst lateness against the load factor flown, each point with its speed."""
    units = Units(shape.job.scene.film.units)
    _plain(axes, "The trade", "greatest g flown on the way down", "worst freeze: s too late")
    worst = {t.pull.load_factor: (t.frozen.worst_s, t.pull, t.frozen) for t in shape.trade
             if t.pull is not None and t.frozen is not None}
    start = shape.start_pull.load_factor, (shape.start.worst_s, shape.start_pull, shape.start)
    values = np.array([w for w, _, _ in [*worst.values(), start[1]]]).ravel()
    finite = values[np.isfinite(values)]
    high = max(float(finite.max(initial=1.0)) * 1.15, 1.0)
    low = min(float(finite.min(initial=0.0)), 0.0)
    foot = low - 0.28 * (high - low)
    axes.axhspan(0.0, high, color=TOO_LATE, zorder=0)
    axes.axhline(0.0, color=INK, linewidth=1.2)
    best, marks = chosen(shape), [*((g, w, AFTER) for g, w in sorted(worst.items())), (*start, BEFORE)]
    for n, (load, (late, pull, _), colour) in enumerate(marks):
        early, likely, slow = (foot if np.isneginf(v) else min(v, high) for v in late)
        axes.plot([load, load], [early, slow], color=colour, linewidth=5.0, alpha=0.3, solid_capstyle="butt")
        big = best is not None and pull is best.pull and colour == AFTER
        axes.plot([load], [likely], marker="D" if colour == BEFORE else "o", color=colour, markersize=9 if big else 7,
                  zorder=4)
        axes.annotate(f"{load:.1f} g, {units.speed(pull.speed_max_mps)}", (load, likely), (0, 9 + 13 * (n % 3)),
                      textcoords="offset points", fontsize=8.0, color=colour, ha="center", va="bottom", zorder=5,
                      bbox={"facecolor": "white", "edgecolor": "none", "alpha": 0.8, "pad": 0.8})
    axes.axhspan(foot - 0.06 * (high - low), foot + 0.045 * (high - low), color="#e3eef6", zorder=0)
    loads = [m[0] for m in marks]
    pad = 0.2 * (max(loads) - min(loads)) + 0.15
    axes.set_xlim(min(loads) - pad, max(loads) + pad)
    axes.set_ylim(foot - 0.14 * (high - low), high)
    axes.text(min(loads) - 0.9 * pad, foot - 0.07 * (high - low), "every freeze clears by itself", fontsize=8.0,
              color=AFTER, va="top", ha="left")
    axes.locator_params(axis="x", nbins=4)
    axes.yaxis.set_major_locator(MaxNLocator(6, integer=True))
    ticks = [t for t in axes.get_yticks() if low - 1e-9 <= t <= high]
    axes.set_yticks(ticks, [f"{t:+.0f}" if t else "0" for t in ticks])


def write_shape_chart(shape: Shape, stem: Path, *, force: bool = False) -> tuple[Path, Path]:
    """Write the chart as ``<stem>.png`` and ``<stem>.svg``; returns their paths. Raises as ``whole_file`` does."""
    figure = shape_figure(shape)
    made = stem.with_name(f"{stem.name}.png"), stem.with_name(f"{stem.name}.svg")
    writers: tuple[Callable[[Path], None], ...] = (
        lambda path: FigureCanvasAgg(figure).print_png(str(path)),
        lambda path: FigureCanvasSVG(figure).print_svg(str(path), metadata={"Date": None}),
    )
    for path, write in zip(made, writers, strict=True):
        with whole_file(path, force=force) as part:
            write(part)
    return made
