"""The frozen table against section 8 of NOTICING.md, and what orders the observers."""

from __future__ import annotations

import numpy as np
import pytest

from render.sight.cues import UNITS
from render.sight.observers import TABLE, TECHNIQUE, attention_gain, effective_sigma, sensory_sigma, source
from render.types import OBSERVERS

DEG = np.pi / 180.0

# Section 8, row by row.
SECTION_8 = {
    "flow": (0.06, 0.10, 0.20),
    "closing": (0.07, 0.10, 0.13),
    "load": (0.07, 0.10, 0.20),
    "tilt": (1 * DEG, 3 * DEG, 5 * DEG),
    "turning": (1 * DEG, 2 * DEG, 4 * DEG),
    "felt rate": (1 * DEG, 2 * DEG, 4 * DEG),
}


@pytest.mark.parametrize("cue", SECTION_8)
def test_thresholds_are_those_of_section_8(cue: str) -> None:
    assert tuple(TABLE[o].weber[cue].value for o in OBSERVERS) == pytest.approx(SECTION_8[cue])


def test_technique_reaction_attention_are_those_of_section_8() -> None:
    technique = {"load": 0.08, "tilt": 4 * DEG, "turning": 2 * DEG, "felt rate": 2 * DEG, "flow": 0.15, "closing": 0.2}
    assert {c: TECHNIQUE[c].value for c in technique} == pytest.approx(technique)
    assert [TABLE[o].reaction.value for o in OBSERVERS] == [0.8, 1.5, 3.0]
    assert [TABLE[o].attention.value for o in OBSERVERS] == [1.0, 0.5, 0.25]
    assert [TABLE[o].lapse.value for o in OBSERVERS] == [0.1, 0.3, 0.5]
    assert all(60 * DEG <= TABLE[o].reach.value <= 90 * DEG for o in OBSERVERS)


def test_inattention_is_never_stacked() -> None:
    # "K, attention and lapse all describe inattention: never stack the three at their worst."
    for o in OBSERVERS:
        assert TABLE[o].field_factor.value == 1.0
        assert sensory_sigma("tilt", TABLE[o], np.array(0.0)) == pytest.approx(TABLE[o].weber["tilt"].value)


def test_every_figure_says_where_it_is_from() -> None:
    for cue in UNITS:
        for o in OBSERVERS:
            figure = TABLE[o].weber[cue]
            assert figure.status in {"published", "from memory", "guess"}
            assert figure.ids and figure.unit
            assert figure.ids in source(cue)
        assert TECHNIQUE[cue].status in {"published", "from memory", "guess"}


def test_gain_falls_linearly_to_its_floor() -> None:
    # 1.49: linear fall of the evidence rate with eccentricity; floor 0.1 (6.2).
    e = np.radians([0.0, 45.0, 90.0, 140.0])
    assert attention_gain(e, TABLE["early"]) == pytest.approx([1.0, 0.5, 0.1, 0.1])
    assert attention_gain(e, TABLE["late"])[0] == pytest.approx(0.25)


def test_horizon_off_the_gaze() -> None:
    # 1.30: 1 deg in the fovea, 3 deg at 30 deg, 5 deg at 60 deg.
    e = np.radians([0.0, 30.0, 60.0])
    assert sensory_sigma("tilt", TABLE["early"], e) / DEG == pytest.approx([1.0, 3.0, 5.0])


@pytest.mark.parametrize("cue", list(UNITS))
def test_noise_grows_from_early_to_late(cue: str) -> None:
    e = np.linspace(0.0, np.pi, 60)
    for off in (e, None):
        early, likely, late = (effective_sigma(cue, TABLE[o], off, 1.7) for o in OBSERVERS)
        assert np.all(early <= likely) and np.all(likely <= late)
        assert np.all(early > 0.0)
