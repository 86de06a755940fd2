"""Notices of toy flights: never before the fault, in order, mirrored, and near the sanity run of NOTICING.md."""

from __future__ import annotations

import numpy as np
import pytest

from render.sight import detect
from render.sight.notice import notice_all
from render.types import OBSERVERS, CueHistory, Flight, Notice
from scenes.model import Watch
from tests.sight.toy import flat, planar, sagging

HEALTHY = planar(lambda s: 4.0)
FAULTED = planar(sagging(4.0, 3.2, 0.5), fault_s=0.0)


def times(notices: tuple[Notice, ...]) -> list[float]:
    return [np.inf if n.time_s is None else n.time_s for n in notices]


def cue(made: tuple[CueHistory, ...], name: str) -> CueHistory:
    return next(h for h in made if h.name == name)


def test_sanity_run_of_noticing_6_6() -> None:
    """NOTICING.md 6.6 (toy, one case, illustrative): V 130 m/s, vertical to level, n 4 against 3.2, onset 0.5 s.

    Its crossings (early, likely, late), with no delay and no dwell: tilt 3.1, 3.4, 4.3; G 0.5, none, none;
    canal none; the healthy one bottoms at 101 m, contact 6.2 s. Flow and tau there were taken without
    attention, so only their order can be looked for: after the tilt.
    """
    assert HEALTHY.height_m[:, 0].min() == pytest.approx(101.0, abs=1.0)
    assert FAULTED.contact_s[0] == pytest.approx(6.2, abs=0.1)
    cues, notices = notice_all(HEALTHY, FAULTED, Watch(), flat)

    def crossing(name: str, observer: str) -> float:
        h = cue(cues["slot1"], name)
        return float(detect.notice(HEALTHY.time_s, h.difference, h.sigma[observer])) - 0.3

    vision, felt = 0.1, 0.05
    # The early one's 2 sqrt(1 + 16) = 8.25 deg is crossed at 2.85 s; the 3.1 s there belongs to 9.0 deg, so
    # that run took its early sigma a little larger than its own table gives. Within that rounding only.
    assert crossing("tilt", "early") - vision == pytest.approx(3.1, abs=0.3)
    assert crossing("tilt", "likely") - vision == pytest.approx(3.4, abs=0.1)
    assert crossing("tilt", "late") - vision == pytest.approx(4.3, abs=0.1)
    assert crossing("load", "early") - felt == pytest.approx(0.5, abs=0.05)
    assert np.isinf(crossing("load", "likely")) and np.isinf(crossing("load", "late"))
    assert all(np.isinf(crossing("felt rate", o)) for o in OBSERVERS)
    for o in ("early", "likely"):  # the late one's flow isn't noticed at all
        assert crossing("tilt", o) < crossing("closing", o) < crossing("flow", o)
    assert [n.cue for n in notices["slot1"]] == ["load", "tilt", "tilt"]


@pytest.mark.parametrize("heading", [0.0, 0.3, 2.5])
@pytest.mark.parametrize("aft", [0.0, 12.0])
def test_left_and_right_wing_notice_alike(heading: float, aft: float) -> None:
    slots = ((aft, 14.0, 3.0), (aft, -14.0, 3.0))
    h = planar(lambda s: 4.0, slots=slots, heading_rad=heading)
    f = planar(sagging(4.0, 3.2, 0.5, 1.0), slots=slots, heading_rad=heading, fault_s=1.0)
    cues, notices = notice_all(h, f, Watch(), flat)
    assert times(notices["slot1"]) == pytest.approx(times(notices["slot2"]), abs=1e-9)
    assert [n.cue for n in notices["slot1"]] == [n.cue for n in notices["slot2"]]
    for right, left in zip(cues["slot1"], cues["slot2"], strict=True):
        assert np.abs(right.difference) == pytest.approx(np.abs(left.difference), abs=1e-9)


def test_formation_that_sags_together_keeps_its_sight_picture() -> None:
    # 0.13: the lead-relative cue is zero if the whole formation degrades together. That is the lesson.
    cues, _ = notice_all(HEALTHY, FAULTED, Watch(), flat)
    assert np.abs(cue(cues["slot1"], "lead").difference).max() < 1e-9


def test_lead_within_what_a_wing_pilot_holds_is_not_noticed() -> None:
    # 1.51: scatter of a held slot 0.3-1 m at 10-20 m; 2 sigma at 14 m are 2 m. The lead 1.5 m too low isn't it,
    # 2.5 m too low is.
    def low_lead(by_m: float) -> Flight:
        slots = ((0.0, 14.0, -by_m),)
        return planar(lambda s: 4.0, slots=slots, fault_s=1.0)

    twin = planar(lambda s: 4.0, slots=((0.0, 14.0, 0.0),))
    _, notices = notice_all(twin, low_lead(1.5), Watch(), flat)
    assert times(notices["slot1"]) == [np.inf] * 3
    _, notices = notice_all(twin, low_lead(2.5), Watch(), flat)
    assert {n.cue for n in notices["slot1"]} == {"lead"}


def test_lead_alone_moves_in_the_canopy() -> None:
    h = planar(lambda s: 4.0, load_wings=lambda s: 4.0)
    f = planar(sagging(4.0, 3.2, 0.5), load_wings=lambda s: 4.0, fault_s=0.0)
    _, notices = notice_all(h, f, Watch(), flat)
    assert {n.cue for n in notices["slot1"]} == {"lead"}
    assert times(notices["slot1"])[2] < 2.0


@pytest.mark.parametrize("look_at", ["lead", "ahead"])
@pytest.mark.parametrize("fault_s", [0.0, 1.013, 3.0])
@pytest.mark.parametrize("watch", [Watch(), Watch(gauges_every_s=4.0), Watch(call_after_s=0.7)])
def test_in_order_and_never_before_the_fault(look_at: str, fault_s: float, watch: Watch) -> None:
    watch = Watch(look_at, watch.gauges_every_s, watch.gauge_look_s, watch.call_after_s)
    f = planar(sagging(4.0, 2.5, 0.5, fault_s), fault_s=fault_s, demand=lambda s: 4.0)
    cues, notices = notice_all(HEALTHY, f, watch, flat)
    for name, three in notices.items():
        early, likely, late = times(three)
        assert fault_s < early <= likely <= late
        assert late < min(c for c in f.contact_s if c is not None) or np.isinf(late)
        for h in cues[name]:
            assert np.all(h.difference[f.time_s <= fault_s] == 0.0)
            assert np.all(h.difference[f.time_s >= (f.contact_s[0] or np.inf)] == 0.0)
            assert np.all(np.isfinite(h.difference))
            assert h.difference.shape == f.time_s.shape == h.sigma["likely"].shape


def test_healthy_twin_is_never_noticed() -> None:
    _, notices = notice_all(HEALTHY, HEALTHY, Watch(), flat)
    assert all(t == np.inf for three in notices.values() for t in times(three))
    # The same with a fault that does nothing.
    idle = planar(lambda s: 4.0, fault_s=1.0)
    _, notices = notice_all(HEALTHY, idle, Watch(gauges_every_s=3.0, call_after_s=0.5), flat)
    assert all(t == np.inf for three in notices.values() for t in times(three))


def test_gauge_look_blinds_and_reads() -> None:
    watch = Watch(gauges_every_s=3.0, gauge_look_s=2.5)
    h = planar(lambda s: 4.0, height0_m=900.0, end_s=8.0)
    f = planar(sagging(4.0, 3.5, 0.5, 1.0), height0_m=900.0, end_s=8.0, fault_s=1.0)
    cues, _ = notice_all(h, f, watch, flat)
    inside = (f.time_s > 3.05) & (f.time_s < 5.45)
    assert np.all(cue(cues["slot1"], "tilt").difference[inside] == 0.0)
    assert np.any(cue(cues["slot1"], "load").difference[inside] != 0.0)  # what is felt goes on
    gauge = cue(cues["slot1"], "gauge").difference
    assert np.all(gauge[f.time_s < 5.45] == 0.0)
    k = int(np.searchsorted(f.time_s, 5.5))
    expected = max(
        abs(f.height_m[k, 1] - h.height_m[k, 1]) / 15.24,  # 50 ft
        abs(f.load_factor[k, 1] - h.load_factor[k, 1]) / 0.2,
    )
    assert gauge[k + 10] == pytest.approx(expected, rel=0.02)
    assert np.ptp(gauge[k + 10 :]) < 0.02 * expected  # held until the next look ends


def test_lead_notices_missing_g_and_his_call_is_heard() -> None:
    f = planar(sagging(4.0, 2.2, 0.5, 1.0), fault_s=1.0, demand=lambda s: 4.0)
    _, alone = notice_all(HEALTHY, f, Watch(), flat)
    assert [n.cue for n in alone["lead"]] == ["load"] * 3
    _, called = notice_all(HEALTHY, f, Watch(call_after_s=0.1), flat)
    for wing, lead, before in zip(called["slot1"], called["lead"], alone["slot1"], strict=True):
        assert wing.time_s is not None and lead.time_s is not None
        assert wing.time_s <= lead.time_s + 0.1 + 0.3 + 0.041  # heard, and a dwell to understand
        assert before.time_s is None or wing.time_s <= before.time_s


def test_lead_who_gets_what_he_asks_for_feels_nothing() -> None:
    # The surface does what the stick asks: less demanded, less got; no missing g.
    f = planar(sagging(4.0, 3.0, 0.5), fault_s=0.0)
    cues, notices = notice_all(HEALTHY, f, Watch(), flat)
    assert times(notices["lead"]) == [np.inf] * 3
    assert np.all(cue(cues["lead"], "load").difference == 0.0)


def test_stick_force_is_felt_by_the_lead() -> None:
    h = planar(lambda s: 4.0, force=lambda s: 60.0)
    f = planar(lambda s: 4.0, force=lambda s: 60.0 + 40.0 * max(s - 1.0, 0.0), fault_s=1.0)
    _, notices = notice_all(h, f, Watch(), flat)
    assert {n.cue for n in notices["lead"]} == {"stick force"}
    assert times(notices["slot1"]) == [np.inf] * 3


def test_lateness_and_reaction() -> None:
    _, notices = notice_all(HEALTHY, FAULTED, Watch(), flat, (4.0, 4.5, None))
    for n in notices["slot1"]:
        assert n.time_s is not None and n.lateness_s == pytest.approx(n.time_s + n.reaction_s - 4.5)
    assert [n.reaction_s for n in notices["slot1"]] == [0.8, 1.5, 3.0]
    assert all(n.lateness_s is None for n in notices["slot2"])


def test_finer_sampling_changes_little() -> None:
    def at(step: float) -> Flight:
        return planar(sagging(4.0, 3.2, 0.5), fault_s=0.0, step_s=step)

    _, coarse = notice_all(planar(lambda s: 4.0, step_s=0.04), at(0.04), Watch(), flat)
    _, fine = notice_all(planar(lambda s: 4.0, step_s=0.005), at(0.005), Watch(), flat)
    assert times(coarse["slot1"]) == pytest.approx(times(fine["slot1"]), abs=0.03)


def test_different_time_axes_are_refused() -> None:
    with pytest.raises(ValueError, match="one time axis"):
        notice_all(planar(lambda s: 4.0, end_s=8.0), FAULTED, Watch(), flat)
