"""The page's linked chart: seconds left against time, and under it one lane for each observer.

A lane runs from the fault to where the observer could notice (its mark), then as a hatched bar through his
reaction. What of it lies in the shaded part right of the last pull is too late: that is the whole message.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from render.output import page_svg as ps
from render.output.events import slot_index, slot_title, study_events
from render.output.page_svg import Scale, Svg
from render.output.tables import break_out_words
from render.output.texts import margin_at
from render.output.words import Units, cue_words, lateness_words
from render.types import Notice, Study

CHAR = 0.56  # width of a letter against the size of its text, on the average of DejaVu Sans
TOP_LEFT_S, LOW_LEFT_S = 12.0, -6.0  # the plot shows no more seconds left than these


@dataclass(frozen=True, slots=True)
class Layout:
    """Sizes in drawing units."""

    width: float
    left: float
    right: float
    label_rows: int
    plot: float
    lane: float
    size: float


WIDE = Layout(720.0, 62.0, 10.0, 2, 112.0, 25.0, 13.0)
NARROW = Layout(360.0, 46.0, 6.0, 3, 130.0, 40.0, 13.0)
EVENT_WORDS = {"fault": "fault", "last_pull_floor": "last pull", "vertical_down": "vertical down", "top": "top",
               "bottom": "bottom", "contact": "contact"}


def margin_chart(study: Study, slot: str, start_s: float, end_s: float, name: str, *, wide: bool) -> str:
    """The chart as SVG; data-t0, t1, x0, x1 tell a script where an instant stands. wide False: for a phone."""
    lay = WIDE if wide else NARROW
    notes = study.notices.get(slot, ()) if study.faulted.fault_s is not None else ()
    row = lay.size * 1.45
    plot_top = 4 + row * lay.label_rows
    lanes_top = plot_top + lay.plot + 8
    axis = lanes_top + lay.lane * len(notes) + 2
    svg = Svg(lay.width, axis + 36, f"Seconds left before the last pull, {slot_title(slot).lower()}",
              _described(study, slot, notes), name, f"chart {'wide' if wide else 'narrow'}")
    x = Scale(start_s, end_s, lay.left, lay.width - lay.right)
    svg.data = {"t0": f"{start_s:.4f}", "t1": f"{end_s:.4f}", "x0": ps.number(x.p0), "x1": ps.number(x.p1)}
    _shading(svg, study, slot, notes, x, plot_top, axis)
    _plot(svg, study, slot, x, plot_top, lay)
    for i, note in enumerate(notes):
        _lane(svg, study, slot, note, x, lanes_top + i * lay.lane, lay)
    _axis(svg, study, x, plot_top, axis, lay)
    _events(svg, study, slot, x, plot_top, axis, lay)
    svg.line(x.p0, plot_top - 2, x.p0, axis, ps.INK, "cursor", stroke_width=2, display="none")
    return svg.render()


def _described(study: Study, slot: str, notes: tuple[Notice, ...]) -> str:
    k = slot_index(study, slot)
    base = study.faulted.fault_s or 0.0
    last = study.margin.last_pull_floor_s[k]
    words = ["Against time after the fault." if study.faulted.fault_s is not None else "Against time from the start."]
    words.append("The margin does not run out." if last is None else f"Last pull at {last - base:.1f} s.")
    for note in notes:
        if note.time_s is None:
            words.append(f"{note.observer.capitalize()} observer: never noticed.")
        else:
            words.append(f"{note.observer.capitalize()} observer could notice at {note.time_s - base:.1f} s by "
                         f"{cue_words(note.cue)}, reaction {note.reaction_s:.1f} s, "
                         f"{lateness_words(note.lateness_s)}.")
    return " ".join(words)


def _shading(
    svg: Svg, study: Study, slot: str, notes: tuple[Notice, ...], x: Scale, top: float, bottom: float
) -> None:
    last = study.margin.last_pull_floor_s[slot_index(study, slot)]
    if last is not None and last < x.v1:
        left = max(x.at(last), x.p0)
        svg.rect(left, top, x.p1 - left, bottom - top, ps.LATE_FILL, "late-fill")
    times = [n.time_s for n in notes if n.time_s is not None]
    if times:
        left, right = max(x.at(times[0]), x.p0), min(x.at(times[-1]), x.p1)
        svg.rect(left, top, max(right - left, 2.0), bottom - top, ps.SIGHT_FILL, "sight-fill", fill_opacity=0.45)


def _plot(svg: Svg, study: Study, slot: str, x: Scale, top: float, lay: Layout) -> None:
    times = np.linspace(x.v0, x.v1, 160)
    curves = {name: np.array([margin_at(study, name, float(t)) for t in times]) for name in study.faulted.names}
    k = slot_index(study, slot)
    if study.margin.no_pull_left[k] and study.faulted.fault_s is not None:
        curves[slot] = np.where(times >= study.faulted.fault_s, np.nan, curves[slot])
    others = [n for n in study.faulted.names if n not in (slot, "lead")]
    shown = np.concatenate([curves[n] for n in (slot, *others)])
    shown = shown[np.isfinite(shown)]
    bottom = top + lay.plot
    if not shown.size:
        svg.rect(x.p0, top, x.p1 - x.p0, lay.plot, "none", "frame", stroke=ps.RULE)
        words = "no pull left" if study.margin.no_pull_left[k] else "the margin does not run out"
        svg.text((x.p0 + x.p1) / 2, top + lay.plot / 2, words, "t", ps.QUIET, lay.size + 1, "middle")
        return
    low = max(float(shown.min()), LOW_LEFT_S)
    high = max(min(float(shown.max()), TOP_LEFT_S), low + 1.0, 1.0)
    y = Scale(min(low, -0.3 * high, -1.0), high, bottom, top)
    for tick in ps.ticks(y.v0, y.v1, 4):
        zero = abs(tick) < 1e-9
        svg.line(x.p0, y.at(tick), x.p1, y.at(tick), ps.QUIET if zero else ps.RULE, "zero" if zero else "rule",
                 stroke_width=1.5 if zero else 1)
        svg.text(x.p0 - 6, y.at(tick) + lay.size * 0.35, f"{tick:g} s", "t", ps.QUIET, lay.size - 1, "end")
    for name in (*others, slot):
        own = name == slot
        values = np.where((curves[name] > y.v1) | (curves[name] < y.v0), np.nan, curves[name])
        dash = None if own else ("7 4", "2 3")[others.index(name) % 2]
        svg.curve(x(times), y(values), ps.BLUE if own else ps.QUIET, "own" if own else "other", 3 if own else 1.6,
                  stroke_dasharray=dash)
    svg.text(x.p0 + 6, bottom - 6, "seconds left before the last pull", "t halo", ps.QUIET, lay.size - 1)
    _legend(svg, slot, others, curves, x, top, lay)


def _legend(svg: Svg, slot: str, others: list[str], curves: dict[str, ps.Array], x: Scale, top: float,
            lay: Layout) -> None:
    names = [(slot, "3", None)] + [(n, "1.6", ("7 4", "2 3")[i % 2]) for i, n in enumerate(others[:2])]
    for i, (name, width, dash) in enumerate(names):
        words = slot_title(name).lower()
        if name != slot and _same(curves[name], curves[slot]):
            words += " (the same)"
        y = top + lay.size * 1.25 * (i + 1)
        svg.text(x.p1 - 4, y, words, "t strong" if name == slot else "t", ps.INK, lay.size - 1, "end")
        left = x.p1 - 10 - len(words) * (lay.size - 1) * CHAR
        svg.line(left - 26, y - 4, left - 2, y - 4, ps.BLUE if name == slot else ps.QUIET,
                 "own" if name == slot else "other", stroke_width=width, stroke_dasharray=dash)


def _same(a: ps.Array, b: ps.Array) -> bool:
    return bool(np.array_equal(np.isfinite(a), np.isfinite(b)) and np.nanmax(np.abs(a - b), initial=0.0) < 0.05)


MARKS = {"early": "M0 -6L6 5L-6 5Z", "likely": "M0 -6A6 6 0 1 1 0 6A6 6 0 1 1 0 -6Z",
         "late": "M-5.5 -5.5H5.5V5.5H-5.5Z"}


def _lane(svg: Svg, study: Study, slot: str, note: Notice, x: Scale, top: float, lay: Layout) -> None:
    wide = lay is WIDE
    middle = top + (lay.lane / 2 if wide else lay.lane - 12)
    svg.text(x.p0 - 8, middle + lay.size * 0.35, note.observer, "t", ps.INK, lay.size, "end")
    first = max(x.at(study.faulted.fault_s or 0.0), x.p0)
    seen = note.time_s is not None and note.time_s <= x.v1
    at = x.at(note.time_s) if seen and note.time_s is not None else x.p1
    ends = at
    svg.line(first, middle, max(at, first), middle, ps.FAINT, "unseen", stroke_width=2, stroke_dasharray="2 4")
    if seen and note.time_s is not None:
        ends = _reaction(svg, note, note.time_s, x, middle)
    words, tone, fill = _result(study, slot, note, seen)
    attributes = (words, f"t strong {tone} halo", fill, lay.size)
    width = len(words) * lay.size * CHAR
    if not wide:
        svg.text(x.p0 + 2, middle - 13, *attributes)
    elif x.p0 + 6 + width < first:
        svg.text(x.p0 + 6, middle + lay.size * 0.35, *attributes)
    elif ends + 10 + width < x.p1:
        svg.text(ends + 10, middle + lay.size * 0.35, *attributes)
    else:
        svg.text(at - 14, middle + lay.size * 0.35, *attributes, "end")


def _result(study: Study, slot: str, note: Notice, seen: bool) -> tuple[str, str, str]:
    """What a lane says of its observer, the class of its colour, and the colour."""
    if note.time_s is None:
        return "never noticed", "quiet", ps.QUIET
    if note.lateness_s is None:
        words = break_out_words(study, slot, note, Units(study.scene.film.units))
        return ("acts" if words == "-" else f"lowest: {words}") + ("" if seen else ", later"), "quiet", ps.QUIET
    late = round(note.lateness_s, 1) > 0
    words = lateness_words(note.lateness_s) + ("" if seen else ", after this film")
    return words, "late" if late else "hand", ps.LATE if late else ps.HAND


def _reaction(svg: Svg, note: Notice, time_s: float, x: Scale, middle: float) -> float:
    """The mark where an observer could notice and the bar of his reaction; returns where that ends."""
    at, ends = x.at(time_s), min(x.at(time_s + note.reaction_s), x.p1)
    svg.rect(at, middle - 6, ends - at, 12, f"url(#{svg.name}-h)", "reaction", stroke=ps.SIGHT)
    if time_s + note.reaction_s <= x.v1:
        svg.line(ends, middle - 9, ends, middle + 9, ps.INK, "acts", stroke_width=3)
    else:
        svg.add("path", d=f"M{ps.number(x.p1 - 7)} {ps.number(middle - 7)}l7 7l-7 7", fill="none", stroke=ps.INK,
                cls="acts", stroke_width=2.5)
    svg.add("path", d=MARKS[note.observer], fill=ps.SIGHT, cls="mark", stroke=ps.BACK, stroke_width=1,
            transform=f"translate({ps.number(at)} {ps.number(middle)})")
    return ends


def _axis(svg: Svg, study: Study, x: Scale, top: float, bottom: float, lay: Layout) -> None:
    base = study.faulted.fault_s or 0.0
    svg.raw(ps.hatch(f"{svg.name}-h", ps.SIGHT))
    svg.line(x.p0, bottom, x.p1, bottom, ps.QUIET, "zero", stroke_width=1.5)
    for tick in ps.ticks(x.v0 - base, x.v1 - base, 9 if lay is WIDE else 6):
        at = x.at(tick + base)
        svg.line(at, bottom, at, bottom + 5, ps.QUIET, "zero", stroke_width=1)
        svg.text(at, bottom + 5 + lay.size, f"{tick:g}", "t", ps.QUIET, lay.size - 1, "middle")
    words = "seconds after the fault" if study.faulted.fault_s is not None else "seconds from the start"
    svg.text(x.p1, bottom + 8 + lay.size * 2, words, "t", ps.QUIET, lay.size - 1, "end")


def _events(svg: Svg, study: Study, slot: str, x: Scale, top: float, bottom: float, lay: Layout) -> None:
    found = [e for e in study_events(study, slot) if e.kind in EVENT_WORDS and x.v0 <= e.time_s <= x.v1 + 1e-6]
    size = lay.size - 0.5
    row_height = lay.size * 1.45
    boxes = []
    for event in found:
        half = len(EVENT_WORDS[event.kind]) * size * CHAR / 2
        middle = min(max(x.at(event.time_s), half + 2), lay.width - half - 2)
        boxes.append((middle - half, middle + half))
    weights = {"fault": 0, "last_pull_floor": 0, "contact": 1}
    order = sorted(range(len(found)), key=lambda i: (weights.get(found[i].kind, 2), boxes[i][0]))
    taken: list[list[tuple[float, float]]] = [[] for _ in range(lay.label_rows)]
    for i in order:
        first, last = boxes[i]
        row = next((r for r in range(lay.label_rows)
                    if all(last + 5 < a or first - 5 > b for a, b in taken[r])), None)
        if row is None:
            continue
        taken[row].append((first, last))
        kind, at = found[i].kind, x.at(found[i].time_s)
        heavy = kind in ("fault", "last_pull_floor", "contact")
        colour = ps.LATE if heavy else ps.FAINT
        y = top - 6 - row * row_height
        svg.line(at, y + 3, at, bottom if heavy else top + 5, colour, "event heavy" if heavy else "event",
                 stroke_width=2 if heavy else 1, stroke_dasharray=None if kind != "fault" else "5 3")
        svg.text((first + last) / 2, y - 1, EVENT_WORDS[kind], "t strong late" if heavy else "t",
                 colour if heavy else ps.QUIET, size, "middle")
