"""A scatter study as one sheet: known in time or not, what was left, the spread at the gates, and what mattered."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from render.decide.cases import GATES
from render.decide.scatter import ScatterStudy, SlotScatter
from render.files import whole_file
from render.output import scatter_words as words
from render.output.events import slot_title
from render.output.words import CAUTION, KNOT_MPS, Units

SIZE_INCH, DPI = (11.69, 8.27), 160
INK, QUIET, RULE = "#11151a", "#5a6570", "#c9d0d6"
SKY, BLUE, VERMILION = "#56b4e9", "#0072b2", "#d55e00"  # Okabe and Ito, as ink.py
TONES = {"short": VERMILION, "mixed": INK, "over": INK}
SHOWN_GATES = ("top", "vertical_down", "bottom")
MOST_INFLUENCES = 6
LEFT = 0.055


def scatter_figure(study: ScatterStudy) -> Figure:
    """The sheet, A4 across."""
    figure = Figure(figsize=SIZE_INCH, dpi=DPI, facecolor="white")
    figure.text(LEFT, 0.965, study.scene.title, fontsize=13, weight="bold", color=INK, va="top")
    figure.text(LEFT, 0.928, f"{len(study.gates)} passes of the team, no two alike (seed {study.seed})", fontsize=9,
                color=QUIET, va="top")
    y = 0.895
    for slot in study.slots:
        text, tone = words.headline(slot)
        figure.text(LEFT, y, text, fontsize=13, weight="bold", color=TONES[tone], va="top")
        y -= 0.038
    top = y - 0.055
    _shares(figure.add_axes((LEFT + 0.07, top - 0.13, 0.42, 0.13)), study)
    _left(figure.add_axes((LEFT + 0.02, 0.135, 0.47, top - 0.13 - 0.115 - 0.135)), study)
    for i, gate in enumerate(SHOWN_GATES):
        _cloud(figure.add_axes((0.605 + i * 0.132, top - 0.225, 0.108, 0.225)), study, gate, first=i == 0)
    _influences(figure.add_axes((0.70, 0.135, 0.265, top - 0.225 - 0.155 - 0.135)), study)
    alarms = max(slot.false_alarms for slot in study.slots)
    figure.text(LEFT, 0.062, f"{words.scatter_line(study)}", fontsize=6.6, color=QUIET, va="top")
    figure.text(LEFT, 0.044, f"False alarms: {100 * alarms:.1f} of 100 passes in which nothing fails. Black lines: 95 "
                "% interval of the draw; the doubt in the model is not in it.", fontsize=6.6, color=QUIET, va="top")
    figure.text(LEFT, 0.023, CAUTION, fontsize=7.5, weight="bold", color=INK, va="top")
    return figure


def _plain(axes: Axes, title: str) -> None:
    axes.set_title(title, fontsize=9, weight="bold", loc="left", color=INK, pad=6)
    axes.tick_params(labelsize=7, colors=QUIET, length=2)
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)
    for side in ("left", "bottom"):
        axes.spines[side].set_color(RULE)


def _shares(axes: Axes, study: ScatterStudy) -> None:
    """Of 100 passes: by itself, in time, too late, a bar a slot."""
    _plain(axes, "Of 100 passes with this fault")
    for i, slot in enumerate(study.slots):
        start = 0.0
        for share, colour in ((slot.by_itself, SKY), (slot.in_time, BLUE), (slot.too_late, VERMILION)):
            width = share.per_100
            axes.barh(i, width, left=start, height=0.62, color=colour)
            if width >= 6.0:
                axes.text(start + width / 2, i, f"{width:.0f}", ha="center", va="center", fontsize=9, weight="bold",
                          color="white" if colour != SKY else INK)
            start += width
        axes.plot([100.0 * (1.0 - slot.too_late.high), 100.0 * (1.0 - slot.too_late.low)], [i, i], color=INK,
                  linewidth=2.2, solid_capstyle="butt")
    axes.set_yticks(range(len(study.slots)), [slot_title(s.slot) for s in study.slots], fontsize=8, color=INK)
    axes.invert_yaxis()
    axes.set_xlim(0.0, 100.0)
    axes.tick_params(axis="y", length=0)
    handles = [("stays above the floor by itself", SKY), ("knew in time", BLUE), ("too late", VERMILION)]
    x = 0.0
    for text, colour in handles:
        axes.text(x, -0.30, "■ ", transform=axes.transAxes, color=colour, fontsize=9, va="top")
        axes.text(x + 0.03, -0.305, text, transform=axes.transAxes, color=INK, fontsize=7.5, va="top")
        x += 0.05 + 0.0145 * len(text)


def _left(axes: Axes, study: ScatterStudy) -> None:
    """How much was left in each pass: a histogram, all slots together, with the passes that never knew beside it."""
    hand = np.concatenate([slot.in_hand_s for slot in study.slots])
    known = hand[np.isfinite(hand)]
    never, not_needed = int(np.sum(hand == -np.inf)), int(np.sum(hand == np.inf))
    _plain(axes, "Seconds in hand when his hand moves" + (" (all slots)" if len(study.slots) > 1 else ""))
    if known.size:
        low, high = np.floor(min(known.min(), -1.0)), np.ceil(max(known.max(), 1.0))
        edges = np.arange(low, high + 0.5, 0.5 if high - low <= 24 else 1.0)
        for part, colour in ((known[known < 0.0], VERMILION), (known[known >= 0.0], BLUE)):
            axes.hist(part, bins=[float(e) for e in edges], color=colour, rwidth=0.9)
        axes.margins(y=0.18)
        axes.axvline(0.0, color=INK, linewidth=1.5)
        axes.text(0.0, 1.0, " last pull", transform=axes.get_xaxis_transform(), fontsize=7.5, color=INK, va="top")
    else:
        axes.set_xticks([])
    axes.set_xlabel("seconds: negative too late, positive in hand", fontsize=7.5, color=QUIET)
    axes.set_ylabel("passes", fontsize=7.5, color=QUIET)
    said = []
    if never:
        said.append(f"never knew before it was over: {100.0 * never / hand.size:.0f} of 100")
    if not_needed:
        said.append(f"nothing needed: {100.0 * not_needed / hand.size:.0f} of 100")
    axes.text(0.015, 0.97, "\n".join(said), transform=axes.transAxes, fontsize=8, color=INK, va="top",
              bbox={"facecolor": "white", "edgecolor": "none", "alpha": 0.8, "pad": 1.5})


def _cloud(axes: Axes, study: ScatterStudy, gate: str, *, first: bool) -> None:
    """Height against speed of every pass at a gate, and their spread in figures."""
    units = Units(study.scene.film.units)
    scale = KNOT_MPS if units.name == "feet" else 1.0 / 3.6
    rows = study.gates[:, GATES.index(gate)]
    speed, height = rows[:, 2] / scale, rows[:, 1] * units.length_value(1.0)
    _plain(axes, words.GATE_WORDS[gate].capitalize())
    axes.plot(speed, height, linestyle="none", marker="o", markersize=2.2, color=BLUE, alpha=0.45,
              markeredgewidth=0.0)
    mean, sd = words.gate_spread(study, gate)
    if np.all(np.isfinite(mean)):
        axes.errorbar(mean[1] / scale, mean[0] * units.length_value(1.0), xerr=sd[1] / scale,
                      yerr=sd[0] * units.length_value(1.0), color=INK, linewidth=1.4, zorder=4)
        axes.text(0.0, -0.24, f"{units.length_value(mean[0]):,.0f} ± {units.length_value(sd[0]):.0f} "
                  f"{units.length_unit}\n{mean[1] / scale:.0f} ± {sd[1] / scale:.1f} {units.speed_unit}\n"
                  f"{mean[2]:.1f} ± {sd[2]:.2f} g", transform=axes.transAxes, fontsize=7.5, color=INK, va="top")
    axes.set_xlabel(units.speed_unit, fontsize=6.5, color=QUIET, labelpad=1, loc="right")
    if first:
        axes.set_ylabel(f"height, {units.length_unit}", fontsize=7, color=QUIET, labelpad=1)
    axes.tick_params(labelsize=6)
    axes.locator_params(nbins=4)
    axes.yaxis.set_major_formatter(lambda value, _: f"{value:,.0f}")


def _influences(axes: Axes, study: ScatterStudy) -> None:
    """What goes with more or less left: rank correlations of the slot that fares worst."""
    slot = _worst(study)
    _plain(axes, f"What goes with more left ({slot_title(slot.slot).lower()})")
    some = slot.influences[:MOST_INFLUENCES]
    if not some:
        axes.text(0.5, 0.5, "nothing to tell: every pass ended alike", transform=axes.transAxes, ha="center",
                  fontsize=8, color=QUIET)
        axes.set_xticks([])
        axes.set_yticks([])
        return
    for i, one in enumerate(some):
        sure = one.low > 0.0 or one.high < 0.0
        axes.barh(i, one.rank, height=0.6, color=BLUE if sure else RULE)
        axes.plot([one.low, one.high], [i, i], color=INK, linewidth=1.2)
    axes.set_yticks(range(len(some)), [one.name for one in some], fontsize=8, color=INK)
    axes.invert_yaxis()
    axes.axvline(0.0, color=INK, linewidth=1.0)
    most = max(0.5, *(max(abs(one.low), abs(one.high)) for one in some))
    axes.set_xlim(-most, most)
    axes.tick_params(axis="y", length=0)
    axes.set_xlabel("rank correlation: more of it, less left  |  more left; grey: may be chance", fontsize=7,
                    color=QUIET)


def _worst(study: ScatterStudy) -> SlotScatter:
    return max(study.slots, key=lambda slot: (slot.too_late.count, len(slot.influences)))


def write_scatter_chart(study: ScatterStudy, path: str | Path, *, force: bool = False) -> Path:
    """Write the sheet as PNG. Raises as ``whole_file`` does."""
    figure = scatter_figure(study)
    with whole_file(path, force=force) as part:
        FigureCanvasAgg(figure).print_figure(str(part), dpi=DPI, facecolor="white")
    return Path(path)
