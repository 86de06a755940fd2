"""The map as a chart that is read at once: colour for what becomes of it, numbers in the cells, words on the regions.

Five colours in one order of lightness, so that a grey copy reads the same; PNG, PDF and SVG.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any, Literal

import numpy as np
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.backends.backend_pdf import FigureCanvasPdf
from matplotlib.backends.backend_svg import FigureCanvasSVG
from matplotlib.collections import LineCollection, PolyCollection
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Rectangle
from numpy.typing import NDArray

from render.decide.map import Map, Outcome, same_slots
from render.decide.map_words import amount_words, own_row, runs
from render.decide.values import Axis
from render.files import whole_file
from render.output.ink import font, wrap_text
from render.output.words import CAUTION, Units

WIDTH, MARGIN = 11.69, 0.62  # A4 across, inches
TITLE, SWATCHES, PANEL_FOOT, FOOT = 1.26, 0.50, 0.66, 0.84
ROW, ROW_MOST, GRID_LEAST = 0.40, 4.6, 2.4
DPI = 160
INK, QUIET, RULE = "#11151a", "#5a6570", "#c9d0d6"
GROUND_LINE: dict[str, Any] = {"color": "#d55e00", "linewidth": 1.8}
CASING: dict[str, Any] = {"color": "white", "linewidth": 3.4}
TICK_PT = 3.2  # marks on the side of the ground's line where the flight meets the ground
MARK = "#f0e442"
MEASURE = 10.0  # texts are measured this much larger than they are set, since fonts are measured in whole pixels

# Okabe and Ito's hues, from light to dark: what is well is light, what is too late is black
FILL = {
    Outcome.CLEARS: "#ffffff", Outcome.ALL_IN_TIME: "#c4e8dc", Outcome.LIKELY_IN_TIME: "#56b4e9",
    Outcome.EARLY_IN_TIME: "#e06a00", Outcome.TOO_LATE: "#16181c", Outcome.UNKNOWN: "#e4e4e4",
}
TEXT = {
    Outcome.CLEARS: "#7b8791", Outcome.ALL_IN_TIME: INK, Outcome.LIKELY_IN_TIME: INK, Outcome.EARLY_IN_TIME: "white",
    Outcome.TOO_LATE: "white", Outcome.UNKNOWN: QUIET,
}
LEGEND = {
    Outcome.TOO_LATE: "too late for all,\neven the early one",
    Outcome.EARLY_IN_TIME: "in time for the early\nobserver alone",
    Outcome.LIKELY_IN_TIME: "in time for the early\nand the likely one",
    Outcome.ALL_IN_TIME: "in time for all,\neven the late one",
    Outcome.CLEARS: "clears the floor\nby itself",
    Outcome.UNKNOWN: "can't be flown",
}
REGION = {
    Outcome.TOO_LATE: "TOO LATE, EVEN FOR THE EARLY OBSERVER", Outcome.EARLY_IN_TIME: "EARLY OBSERVER ALONE IN TIME",
    Outcome.LIKELY_IN_TIME: "EARLY AND LIKELY IN TIME", Outcome.ALL_IN_TIME: "ALL IN TIME",
    Outcome.CLEARS: "CLEARS BY ITSELF", Outcome.UNKNOWN: "CAN'T BE FLOWN",
}
SHORT_REGION = {Outcome.TOO_LATE: "TOO LATE", Outcome.EARLY_IN_TIME: "EARLY ALONE", Outcome.CLEARS: "CLEARS"}
HEAD = {
    Outcome.CLEARS: "it clears by itself", Outcome.ALL_IN_TIME: "all in time",
    Outcome.LIKELY_IN_TIME: "likely observer in time", Outcome.EARLY_IN_TIME: "early observer alone in time",
    Outcome.TOO_LATE: "too late for everyone",
    Outcome.UNKNOWN: "can't be flown",
}


def map_figure(found: Map) -> Figure:
    """The chart as a figure, one panel for each group of slots that fare alike."""
    groups = same_slots(found)
    grid_height = min(max(ROW * len(found.y.values), GRID_LEAST), ROW_MOST)
    panel = 0.34 + grid_height + PANEL_FOOT
    height = TITLE + SWATCHES + len(groups) * panel + FOOT
    figure = Figure(figsize=(WIDTH, height), dpi=DPI, facecolor="white")
    page = _Page(figure, height)
    below = page.say(MARGIN, 0.30, headline(found, groups[0]), 15.0, weight="bold", lines=2)
    page.say(MARGIN, below + 0.06, found.scene.title, 9.0, colour=QUIET)
    _legend(page, found, TITLE - 0.06)
    for n, group in enumerate(groups):
        top = TITLE + SWATCHES + n * panel
        names = " and ".join(found.cases.names[k] for k in group)
        page.say(MARGIN, top, f"{names[:1].upper()}{names[1:]}", 10.0, weight="bold")
        box = (MARGIN + 0.55, top + 0.30, WIDTH - 2 * MARGIN - 0.55, grid_height)
        _panel(page.axes(*box), found, group[0], box[2], grid_height)
    bottom = height - FOOT
    numbered = _number_size(*_cell(found, WIDTH - 2 * MARGIN - 0.55, grid_height)) > 0.0
    page.say(MARGIN, bottom, reading(found, numbers=numbered), 7.6, colour=QUIET)
    page.say(MARGIN, height - 0.30, CAUTION, 8.4, weight="bold")
    return figure


class _Page:
    """A figure addressed in inches from its top left corner."""

    def __init__(self, figure: Figure, height: float) -> None:
        self.figure, self.height = figure, height

    def say(self, x: float, y: float, text: str, size: float, *, weight: str = "normal", colour: str = INK,
            lines: int = 99) -> float:
        """Write text from its top at y, broken at the right margin, smaller if it would take more lines; y below it."""
        most = lines
        while True:
            face = font(size * MEASURE, bold=weight == "bold")
            broken = wrap_text(text, face, (WIDTH - MARGIN - x) * 72.0 * MEASURE)
            if len(broken) <= most or size < 8.0:
                break
            size -= 0.5
        self.figure.text(x / WIDTH, 1.0 - y / self.height, "\n".join(broken), fontsize=size, weight=weight,
                         color=colour, va="top", linespacing=1.25)
        return y + len(broken) * size * 1.32 / 72.0

    def axes(self, x: float, y: float, width: float, height: float) -> Axes:
        """Axes with their top left corner at x, y."""
        return self.figure.add_axes((x / WIDTH, 1.0 - (y + height) / self.height, width / WIDTH, height / self.height))


def headline(found: Map, group: tuple[int, ...]) -> str:
    """What an instructor is to take away: the row of the scene's own amount, in a few words, the worst first."""
    j = own_row(found)
    parts = runs(found.outcome[:, j, group[0]])
    start = "Frozen" if found.y.path == "fault.fraction" and found.y.values[j] == 0.0 else amount_words(found.y, j)
    if len(parts) > 4:
        count = int(np.count_nonzero(found.outcome[:, j, group[0]] == Outcome.TOO_LATE))
        return f"{start}: {count} of {len(found.x.values)} points are too late for everyone"
    told = []
    for outcome, first, last in sorted(parts, key=lambda run: (run[0] == Outcome.CLEARS, -run[0])):
        low, high = found.x.text(first), found.x.text(last)
        if len(parts) == 1:
            where = f"anywhere from {_bare(low, found.x)} to {high}"
        elif first == last:
            where = f"at {low}"
        elif last == len(found.x.values) - 1:
            where = f"from {low} on"
        else:
            where = f"from {_bare(low, found.x)} to {high}"
        told.append(f"{where}: {HEAD[outcome]}")
    return f"{start} {'; '.join(told)}" if start == "Frozen" else f"{start}, {'; '.join(told)}"


def _bare(text: str, axis: Axis) -> str:
    return text.removesuffix(axis.unit).rstrip()


def reading(found: Map, *, numbers: bool = True) -> str:
    """How to read the numbers, and what they rest on. numbers: whether there are any, or the cells are too small."""
    units = Units(found.scene.film.units)
    how = (
        "Numbers: seconds the likely observer has in hand when his hand moves, minus where it is too late; small grey "
        f"ones: how far the flight clears the floor by itself, {units.length_unit}. "
        if numbers else "Too many cells for numbers here; they are in map.csv. "
    )
    return (
        f"{how}Floor {units.length(found.scene.floor_m)} above the ground, as the scene asks. Early, likely and late "
        "are three observers: a range, not a forecast of one pilot."
    )


def _legend(page: _Page, found: Map, y: float) -> None:
    """Swatches from worst to best, those that are on the map in ink, the others quiet; then the ground's line."""
    shown = [o for o in LEGEND if o != Outcome.UNKNOWN or np.any(found.outcome == o)]
    step = (WIDTH - 2 * MARGIN) / (len(shown) + 1)

    def entry(i: int, text: str, there: bool) -> float:
        x = MARGIN + i * step
        page.figure.text((x + 0.40) / WIDTH, 1.0 - (y + 0.16) / page.height, text, fontsize=7.4,
                         color=INK if there else "#9aa4ad", va="center", linespacing=1.15)
        return x

    for i, outcome in enumerate(shown):
        there = bool(np.any(found.outcome == outcome))
        x = entry(i, LEGEND[outcome], there)
        page.figure.add_artist(Rectangle(
            (x / WIDTH, 1.0 - (y + 0.30) / page.height), 0.33 / WIDTH, 0.28 / page.height, facecolor=FILL[outcome],
            edgecolor=QUIET, linewidth=0.8, alpha=1.0 if there else 0.35, transform=page.figure.transFigure,
        ))
    met = bool(np.any(np.isfinite(found.cases.contact_s)))
    x = entry(len(shown), "on the toothed side it meets\nthe ground if nobody acts", met)
    line, tooth = 1.0 - (y + 0.12) / page.height, TICK_PT / 72.0 / page.height
    marks = [((x, x + 0.33), (line, line))] + [((x + s, x + s), (line, line - tooth)) for s in (0.055, 0.165, 0.275)]
    for (x0, x1), (y0, y1) in marks:
        page.figure.add_artist(Line2D([x0 / WIDTH, x1 / WIDTH], [y0, y1], alpha=1.0 if met else 0.35,
                                      solid_capstyle="butt", **GROUND_LINE))


def _cell(found: Map, width: float, height: float) -> tuple[float, float]:
    """Width and height of a cell, points, of a grid so many inches wide and high."""
    nx, ny = found.shape
    return 72.0 * width / nx, 72.0 * height / ny


def _number_size(cell_w: float, cell_h: float) -> float:
    """Size of the numbers in cells, points; 0 where they are too small for any."""
    size = min(7.6, 0.27 * cell_w, 0.42 * cell_h)
    return size if size >= 3.0 else 0.0


def _panel(axes: Axes, found: Map, slot: int, width: float, height: float) -> None:
    """One grid of cells, 1 by 1 each, with numbers, regions, the scene's own place and the ground's line."""
    nx, ny = found.shape
    outcome = found.outcome[:, :, slot]
    cell_w, cell_h = _cell(found, width, height)
    size = _number_size(cell_w, cell_h)
    _cells(axes, outcome)
    _numbers(axes, found, slot, size)
    contact = np.isfinite(found.grid("contact_s")[:, :, slot + 1]) | np.isfinite(found.grid("contact_s")[:, :, 0])
    edges = _edges(contact)
    _ground_line(axes, edges, TICK_PT / cell_w, TICK_PT / cell_h)
    # where no numbers stand, the words need not fit between them
    _name_regions(axes, outcome, cell_w, cell_h if size > 0.0 else 25.0, _mark_scene(axes, found), edges)
    axes.set_xlim(0, nx)
    axes.set_ylim(0, ny)
    _ticks(axes, found.x, "x", cell_w)
    _ticks(axes, found.y, "y", cell_h)
    axes.set_xlabel(axis_words(found.x), fontsize=8.6, color=INK, labelpad=5)
    axes.set_ylabel(axis_words(found.y), fontsize=8.6, color=INK, labelpad=6)
    for side in axes.spines.values():
        side.set_color(QUIET)


def _cells(axes: Axes, outcome: NDArray[np.int64]) -> None:
    """The cells' fields, what can't be flown hatched; as collections, since thousands of single ones take seconds."""
    kinds = [Outcome(int(kind)) for kind in outcome.ravel()]
    corner = np.stack(np.meshgrid(*map(np.arange, outcome.shape), indexing="ij"), axis=-1).reshape(-1, 1, 2)
    square = corner + np.array([[0, 0], [1, 0], [1, 1], [0, 1]])
    edge = np.array(["#3a4048" if kind == Outcome.TOO_LATE else RULE for kind in kinds])
    axes.add_collection(PolyCollection(square, facecolors=[FILL[k] for k in kinds], edgecolors=edge, linewidths=0.5))
    unknown = np.array([kind == Outcome.UNKNOWN for kind in kinds])
    axes.add_collection(PolyCollection(square[unknown], facecolors="none", edgecolors=RULE, linewidths=0.5,
                                       hatch="////"))


def _numbers(axes: Axes, found: Map, slot: int, size: float) -> None:
    """Seconds in hand where somebody has to act, the height over the floor where nobody has to."""
    if size <= 0.0:
        return
    units = Units(found.scene.film.units)
    late = found.grid("lateness_s")[:, :, slot, 1]
    over = found.grid("lowest_m")[:, :, slot + 1] - found.scene.floor_m
    for (i, j), kind in np.ndenumerate(found.outcome[:, :, slot]):
        if kind == Outcome.UNKNOWN:
            continue
        colour = TEXT[Outcome(int(kind))]
        if kind == Outcome.CLEARS:
            text, own = f"{units.length_value(float(over[i, j])):.0f}", 0.78 * size
        else:
            text, own = "never" if np.isnan(late[i, j]) else _signed(-float(late[i, j])), size
        axes.text(i + 0.5, j + 0.5, text, fontsize=own, color=colour, ha="center", va="center")


def _signed(value: float) -> str:
    return f"{round(value, 1) + 0.0:+.1f}".replace("-", "\N{MINUS SIGN}")


def _edges(mask: NDArray[np.bool_]) -> list[tuple[int, int, int, int]]:
    """Sides between cells of a mask, (X, Y), and others: x, y of one end, and the way to the mask along x and y.

    One of the two ways is 0, the other -1 or 1; a side with a way along x is upright, of length one.
    """
    found = []
    across, along = np.diff(mask.astype(int), axis=0), np.diff(mask.astype(int), axis=1)
    for i, j in zip(*np.nonzero(across), strict=True):
        found.append((int(i) + 1, int(j), int(across[i, j]), 0))
    for i, j in zip(*np.nonzero(along), strict=True):
        found.append((int(i), int(j) + 1, 0, int(along[i, j])))
    return found


def _ground_line(axes: Axes, edges: list[tuple[int, int, int, int]], tick_x: float, tick_y: float) -> None:
    """The line between flights that meet the ground and those that don't, with teeth on the side of the first."""
    sides: list[list[tuple[float, float]]] = []
    teeth: list[list[tuple[float, float]]] = []
    for x, y, to_x, to_y in edges:
        sides.append([(x, y), (x + (to_x == 0), y + (to_y == 0))])
        for part in (1 / 6, 1 / 2, 5 / 6):
            at_x, at_y = x + part * (to_x == 0), y + part * (to_y == 0)
            teeth.append([(at_x, at_y), (at_x + to_x * tick_x, at_y + to_y * tick_y)])
    axes.add_collection(LineCollection(sides, capstyle="butt", zorder=3, **CASING))
    axes.add_collection(LineCollection(sides + teeth, capstyle="butt", zorder=3, **GROUND_LINE))


def _name_regions(axes: Axes, outcome: NDArray[np.int64], cell_w: float, cell_h: float,
                  taken: int | None, edges: list[tuple[int, int, int, int]]) -> None:
    """Each outcome's words where they have most room: on a line between two rows, clear of the numbers.

    taken: a line where something stands already.
    """
    if cell_h < 20.0:
        return
    for kind, text in REGION.items():
        place = _widest(outcome == kind, taken, edges)
        if place is None:
            continue
        i, j, length = place
        for words in (text, SHORT_REGION.get(kind, text)):
            size = min(11.5, 0.9 * length * cell_w / (0.72 * len(words)), 0.46 * cell_h)
            if size >= 6.5:
                axes.text(i + length / 2, j, words, fontsize=size, weight="bold", ha="center", va="center",
                          color=INK if kind == Outcome.CLEARS else TEXT[kind], zorder=4,
                          bbox={"facecolor": FILL[kind], "edgecolor": "none", "pad": 0.8, "alpha": 0.85})
                break


def _widest(
    mask: NDArray[np.bool_], taken: int | None, edges_of: list[tuple[int, int, int, int]]
) -> tuple[int, int, int] | None:
    """The longest stretch of x that two neighbouring rows of a mask share: first x, the line between, length."""
    best: tuple[float, int, int, int] | None = None
    for j in range(1, mask.shape[1]):
        both = mask[:, j] & mask[:, j - 1]
        edges = np.flatnonzero(np.diff(np.concatenate([[False], both, [False]]).astype(int)))
        for first, end in zip(edges[::2], edges[1::2], strict=True):
            # of equal stretches the one in the middle of the rows
            crossed = sum(y == j and to_y != 0 and first <= x < end for x, y, _, to_y in edges_of)
            score = float(end - first) - 0.02 * abs(j - mask.shape[1] / 2) - 0.6 * crossed
            score -= 100.0 if j == taken else 0.0
            if best is None or score > best[0]:
                best = score, int(first), j, int(end - first)
    return None if best is None else best[1:]


def _mark_scene(axes: Axes, found: Map) -> int | None:
    """A frame round the cell nearest to the scene itself, and its name; returns the line the name stands on."""
    at_x, at_y = found.here
    if at_x is None or at_y is None:
        return None
    i, j = (int(np.argmin(np.abs(np.array(axis.shown()) - at))) for axis, at in ((found.x, at_x), (found.y, at_y)))
    axes.add_patch(Rectangle((i, j), 1, 1, facecolor="none", edgecolor=MARK, linewidth=2.6, zorder=6))
    axes.add_patch(Rectangle((i, j), 1, 1, facecolor="none", edgecolor=INK, linewidth=1.0, zorder=7))
    line = j + 1 if j + 1 < len(found.y.values) else j
    exact = abs(found.x.shown()[i] - at_x) < 1e-6 and abs(found.y.shown()[j] - at_y) < 1e-6
    name = "this scene" if exact else "near this scene"
    axes.text(i + 0.5, line, name, fontsize=7.6, weight="bold", color=INK, ha="center", va="center", zorder=8,
              bbox={"facecolor": MARK, "edgecolor": "none", "pad": 1.4})
    return line


def _ticks(axes: Axes, axis: Axis, which: Literal["x", "y"], cell: float) -> None:
    """The values under their cells, every one or as many as there is room for."""
    room = 26.0 if which == "x" else 12.0
    every = max(1, int(np.ceil(room / cell)))
    at = np.arange(0, len(axis.values), every)
    labels = [f"{axis.shown()[int(i)]:.6g}" for i in at]
    if which == "x":
        axes.set_xticks(at + 0.5, labels)
    else:
        axes.set_yticks(at + 0.5, labels)
    axes.tick_params(axis=which, labelsize=7.6, colors=INK, length=0, pad=4)


def axis_words(axis: Axis) -> str:
    """What an axis shows, in words, with its unit."""
    known = {
        "fault.at.loop_angle": "where the fault comes on: angle of the loop, deg (180 top, 270 vertical down)",
        "fault.fraction": f"control left, {axis.unit or 'part'} (0: frozen)",
        "fault.rate": f"greatest rate of the surface, {axis.unit}",
        "fault.over": f"time of the drift to the no-load angle, {axis.unit}",
        "script.0.level.speed": f"entry speed, {axis.unit}",
        "script.0.level.height": f"entry height, {axis.unit}",
        "day.temperature": f"temperature at the field, {axis.unit}",
    }
    if axis.path in known:
        return known[axis.path]
    return f"{axis.path}, {axis.unit}" if axis.unit else axis.path


def write_map_chart(found: Map, target: Path, *, force: bool = False) -> tuple[Path, ...]:
    """Write the chart as PNG, PDF and SVG beside each other; ``target`` without a suffix. Returns their paths.

    Raises OutputExists, MachineError. All are made before the first takes its place.
    """
    figure = map_figure(found)
    writers: dict[str, Callable[[Path], None]] = {
        ".png": lambda path: FigureCanvasAgg(figure).print_png(str(path)),
        ".pdf": lambda path: FigureCanvasPdf(figure).print_pdf(str(path), metadata={"CreationDate": None}),
        ".svg": lambda path: FigureCanvasSVG(figure).print_svg(str(path), metadata={"Date": None}),
    }
    paths = []
    for suffix, write in writers.items():
        path = target.with_name(target.name + suffix)
        with whole_file(path, force=force) as part:
            write(part)
        paths.append(path)
    return tuple(paths)
