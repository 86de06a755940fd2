"""The map's chart: colours apart in grey and to red-green blind eyes, everything on the page, numbers in the cells."""

from __future__ import annotations

import dataclasses
import itertools

import numpy as np
import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.colors import to_rgb
from matplotlib.figure import Figure

from render.decide.cases import Cases, per_case
from render.decide.map import Map, Outcome, make_map
from render.decide.values import Axis
from render.output.map_chart import FILL, TEXT, axis_words, headline, map_figure
from render.output.map_tables import map_text
from render.output.words import CAUTION
from scenes.model import DEG
from scenes.reader import read_scene

HERO = read_scene("late_freeze")


def made_up(nx: int, ny: int, slots: int = 2, seed: int = 1, *, alike: bool = True) -> Map:
    """A map of any size with every outcome on it, nothing flown."""
    b, rng = nx * ny, np.random.default_rng(seed)
    late = rng.uniform(-4.0, 4.0, (b, 1, 1)) + np.array([-1.0, 0.0, 1.5])
    late = np.repeat(late, slots, axis=1)
    if not alike:
        late[:, -1] += 2.0
    low = np.where(rng.uniform(size=(b, 1)) < 0.3, 60.0, 0.0)
    n = np.nan
    contact = np.where(low == 0.0, 38.0, n)
    cases = Cases(
        names=("right", "left", "box")[:slots], error=(None,) * (b - 1) + ("can't",), fault_s=np.full(b, 30.0),
        contact_s=np.repeat(contact, slots + 1, axis=1), lowest_m=np.repeat(low, slots + 1, axis=1),
        loop_scale=np.ones(b), gates=np.full((b, 5, 4), n), load_factor_max=np.ones(b), speed_max_mps=np.ones(b),
        last_pull_floor_s=np.full((b, slots), 33.0), last_pull_ground_s=np.full((b, slots), 34.0),
        lead_notice_s=np.full((b, 3), n), notice_s=33.0 + late, cue=np.zeros((b, slots, 3), dtype=np.int64),
        reaction_s=np.array([0.8, 1.5, 3.0]), lateness_s=late, clearance_floor_m=late, clearance_ground_m=late,
    )
    assert set(per_case()) <= {f.name for f in dataclasses.fields(cases)}
    x = Axis("fault.at.loop_angle", "angle", "deg", tuple(np.linspace(180.0, 330.0, nx) * DEG))
    y = Axis("fault.fraction", "fraction", "%", tuple(np.linspace(0.0, 0.9, ny)))
    return make_map(HERO, HERO, x, y, cases)


def luminance(colour: tuple[float, ...]) -> float:
    """Relative luminance of an sRGB colour, IEC 61966-2-1 and ITU-R BT.709, as WCAG 2 has it."""
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in colour]
    return float(np.dot([0.2126, 0.7152, 0.0722], linear))


def test_worse_is_darker_and_text_stands_out() -> None:
    """In one order of lightness, each step to be seen; text at least 3:1, the numbers of who must act 4:1."""
    order = [Outcome.CLEARS, Outcome.ALL_IN_TIME, Outcome.LIKELY_IN_TIME, Outcome.EARLY_IN_TIME, Outcome.TOO_LATE]
    light = [luminance(to_rgb(FILL[o])) for o in order]
    assert all(a / b > 1.2 for a, b in itertools.pairwise(light))
    for outcome in order:
        one, other = sorted((luminance(to_rgb(FILL[outcome])), luminance(to_rgb(TEXT[outcome]))))
        contrast = (other + 0.05) / (one + 0.05)
        assert contrast >= (3.0 if outcome in (Outcome.CLEARS, Outcome.EARLY_IN_TIME) else 4.0), outcome


def texts(figure: Figure) -> list[str]:
    return [t.get_text() for axes in figure.axes for t in axes.texts] + [t.get_text() for t in figure.texts]


@pytest.mark.parametrize(("nx", "ny", "slots", "alike"), [(31, 10, 2, True), (5, 3, 3, False), (2, 2, 1, True),
                                                          (60, 40, 2, True)])
def test_everything_is_on_the_page(nx: int, ny: int, slots: int, alike: bool) -> None:
    found = made_up(nx, ny, slots, alike=alike)
    figure = map_figure(found)
    canvas = FigureCanvasAgg(figure)
    canvas.draw()
    page = figure.bbox
    for text in [*figure.texts, *(t for a in figure.axes for t in a.texts), *(a.xaxis.label for a in figure.axes)]:
        box = text.get_window_extent()
        assert box.x0 >= 0.0 and box.x1 <= page.x1 and box.y0 >= 0.0 and box.y1 <= page.y1, text.get_text()
    assert len(figure.axes) == (1 if alike else 2)
    assert CAUTION in texts(figure) and "safe" not in " ".join(texts(figure)).lower()
    # the header's lines don't run into each other, nor the footer's into the charts
    lines = sorted((t.get_window_extent() for t in figure.texts), key=lambda b: -b.y1)
    head = [b for b in lines if b.x0 < 120.0]
    assert all(above.y0 >= below.y1 - 2.0 for above, below in itertools.pairwise(head))


def test_cells_carry_the_likely_observers_seconds() -> None:
    found = made_up(12, 6)
    said = texts(map_figure(found))
    late = found.grid("lateness_s")[:, :, 0, 1]
    must_act = (found.outcome[..., 0] != Outcome.CLEARS) & (found.outcome[..., 0] != Outcome.UNKNOWN)
    wanted = sorted(f"{round(-v, 1) + 0.0:+.1f}".replace("-", "\N{MINUS SIGN}") for v in late[must_act])
    assert sorted(t for t in said if t[:1] in "+\N{MINUS SIGN}") == wanted
    assert said.count("can't be flown") + said.count("CAN'T BE FLOWN") == 1


def test_headline_axes_and_letters() -> None:
    found = made_up(4, 2)
    assert headline(found, (0, 1)).startswith("Frozen ")
    assert axis_words(found.y) == "control left, % (0: frozen)"
    text = map_text(found)
    for outcome in np.unique(found.outcome[..., 0]):
        assert "?.321#"[int(outcome) + 1] in text
    assert text.rstrip().endswith(CAUTION) and max(map(len, text.splitlines())) <= 122
