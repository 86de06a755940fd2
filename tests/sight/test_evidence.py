"""One code for one flight and for a batch."""

from __future__ import annotations

from dataclasses import fields, replace

import numpy as np
import pytest

from render.sight.cues import Seat, log_load, view
from render.sight.evidence import first_notice, lead_evidence, wing_evidence
from render.sight.notice import counting, notice_all, seat
from scenes.model import Watch
from tests.sight.toy import flat, planar, sagging

FAULTS = [(3.6, 1.0), (3.2, 0.5), (2.0, 0.7)]
HEALTHY = planar(lambda s: 4.0, heading_rad=0.0)
FAULTED = [planar(sagging(4.0, n, over), heading_rad=0.0, fault_s=0.0, demand=lambda s: 4.0) for n, over in FAULTS]
GRID = np.arange(0, HEALTHY.time_s.size, 4)


def stacked(seats: list[Seat]) -> Seat:
    made = {
        f.name: np.stack([getattr(s, f.name) for s in seats])
        for f in fields(Seat)
        if isinstance(getattr(seats[0], f.name), np.ndarray)
    }
    return replace(seats[0], **made)


@pytest.mark.parametrize("watch", [Watch(), Watch("ahead", 3.0, 2.5, 0.5)])
def test_batch_equals_single_flights(watch: Watch) -> None:
    time_s = HEALTHY.time_s[GRID]
    counts = np.stack([counting(time_s, HEALTHY, f, 1) for f in FAULTED])
    load = np.stack([f.load_factor[GRID, 0] for f in FAULTED])
    four, none = np.full_like(load, 4.0), np.zeros_like(load)
    called, _ = first_notice(time_s, lead_evidence(four, load, four, four, none, none, time_s, counts))
    twin = seat(HEALTHY, 1, GRID)  # one twin for all, without the batch axis
    evidence = wing_evidence(
        twin, stacked([seat(f, 1, GRID) for f in FAULTED]), time_s, counts, watch, flat, 0.0, called,
        healthy_view=view(twin, flat, 0.0, watch.look_at),
    )  # fmt: skip
    when, leading = first_notice(time_s, evidence)
    for i, f in enumerate(FAULTED):
        _, single = notice_all(HEALTHY, f, watch, flat)
        expected = [np.inf if n.time_s is None else n.time_s for n in single["slot1"]]
        assert when[i] == pytest.approx(expected, abs=1e-9)
        assert [evidence.names[j] for j, t in zip(leading[i], when[i], strict=True) if np.isfinite(t)] == [
            n.cue for n in single["slot1"] if n.cue
        ]


def test_load_is_a_ratio_above_one_g() -> None:
    n = np.array([4.0, 3.2, 1.0, 0.999, 0.0, -1.0])
    assert log_load(n)[:2] == pytest.approx(np.log(n[:2]))
    assert log_load(n)[2:] == pytest.approx(n[2:] - 1.0)


def test_closing_counts_below_ten_seconds_only() -> None:
    # 1.8 (Schiff & Detwiler 1979): no credit for time to contact above 10 s. From 3,000 m at 130 m/s the
    # ground is 23 s away; the faulted flight falls away, but nothing closes.
    h = planar(lambda s: 4.0, height0_m=3000.0, end_s=6.0)
    f = planar(sagging(4.0, 2.0, 0.5), height0_m=3000.0, end_s=6.0, fault_s=0.0)
    cues, _ = notice_all(h, f, Watch(), flat)
    closing = next(c for c in cues["slot1"] if c.name == "closing")
    assert np.all(closing.difference == 0.0)


def test_closing_says_how_much_sooner() -> None:
    # Level ground: tau = h/s at the eye, capped at 10 s; ln of the ratio, 0.1 s later.
    f = FAULTED[1]
    cues, _ = notice_all(HEALTHY, f, Watch(), flat)
    closing = next(c for c in cues["slot1"] if c.name == "closing")

    def tau(k: int, flight: object) -> float:
        s = seat(flight, 1)  # type: ignore[arg-type]
        up = 1.5 * np.sin(flight.gamma_rad[k, 1]) + 0.8 * np.cos(flight.gamma_rad[k, 1])  # type: ignore[attr-defined]
        return min(float((s.height_m[k] + up) / s.vel_e_mps[k, 2]), 10.0)

    k = 440
    assert closing.difference[k] == pytest.approx(np.log(tau(k - 10, HEALTHY) / tau(k - 10, f)), abs=2e-3)
