"""Films' frames from the stage: seats, looks, twins, and what is refused."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np
import pytest

from render.errors import LatepullError
from render.output.source import FrameSource
from render.output.stage_options import StageOptions, picture_words, stage_spec
from render.output.stage_source import GAP_PX, StageSource, open_stage, twin_part
from render.picture.instant import instant_at
from render.picture.views import eye_of
from render.types import Study

SIZE = (320, 180)


@pytest.fixture(scope="module")
def plain(study: Study) -> Iterator[FrameSource]:
    """The right seat as it is without any option."""
    with open_stage(study, "right", SIZE) as source:
        yield source


@pytest.mark.draws
def test_a_seat_shows_its_own_lead_where_the_camera_says(study: Study) -> None:
    with open_stage(study, "right", SIZE, look="lead") as source:
        assert isinstance(source, StageSource)
        frame = source.frame(10.0)
        assert frame.shape == (SIZE[1], SIZE[0], 3) and frame.dtype == np.uint8
        instant = instant_at(study.faulted, 10.0)
        camera = source.camera(instant)
        x, y = camera.project(eye_of(instant, study.faulted.airframes, 0))
        assert 0 < x < SIZE[0] / 2 and 0 < y < SIZE[1] / 2  # left of and above the middle, seen from the right wing


@pytest.mark.draws
def test_the_same_instant_gives_the_same_frame(plain: FrameSource) -> None:
    first = plain.frame(9.0).copy()
    plain.frame(20.0)
    assert np.array_equal(plain.frame(9.0), first)


@pytest.mark.draws
@pytest.mark.parametrize("view", ["chase", "spectator"])
def test_views_from_outside_show_all_aircraft(study: Study, view: str) -> None:
    with open_stage(study, "right", SIZE, view=view) as source:
        assert isinstance(source, StageSource)
        instant = instant_at(study.faulted, 6.0)
        px = source.camera(instant).project(instant.pos_e_m)
        assert np.all((px > 0) & (px < np.array(SIZE)))
        assert source.frame(6.0).std() > 5.0


@pytest.mark.draws
@pytest.mark.parametrize("twin", ["side", "stack"])
def test_twin_halves_are_one_until_the_fault_and_part_after_it(study: Study, twin: str) -> None:
    (width, height), _ = twin_part(SIZE, 0, twin == "stack", study.scene.film.field_rad)
    with open_stage(study, "right", SIZE, twin=twin) as source:
        for time_s, same in ((15.0, True), (23.5, False)):
            frame = source.frame(time_s)
            first = frame[:height, :width]
            second = frame[height + GAP_PX :, :width] if twin == "stack" else frame[:height, width + GAP_PX :]
            assert first.shape[0] == height and np.array_equal(first, second[:height, :width]) is same


@pytest.mark.draws
def test_a_ghost_appears_only_when_the_leads_part(study: Study, plain: FrameSource) -> None:
    with open_stage(study, "right", SIZE, twin="ghost") as ghost:
        assert np.array_equal(ghost.frame(15.0), plain.frame(15.0))
        assert not np.array_equal(ghost.frame(22.5), plain.frame(22.5))


@pytest.mark.draws
def test_the_peripheral_view_is_softer_away_from_the_lead(study: Study, plain: FrameSource) -> None:
    with open_stage(study, "right", SIZE, peripheral=True) as soft:
        sharp, blurred = plain.frame(20.0).astype(float), soft.frame(20.0).astype(float)
        # second differences: the finest detail of all, on the side away from the lead
        detail = [np.abs(np.diff(frame[:, SIZE[0] * 3 // 4 :, 1], 2, axis=1)).mean() for frame in (sharp, blurred)]
        assert detail[1] < 0.5 * detail[0]


@pytest.mark.draws
def test_wide_fields_are_remapped_and_fill_the_frame(study: Study) -> None:
    wide = replace(study, scene=replace(study.scene, film=replace(study.scene.film, field_rad=np.radians(130.0))))
    with open_stage(wide, "right", SIZE) as source:
        assert source.frame(20.0).shape == (SIZE[1], SIZE[0], 3)


def test_halves_of_a_twin_fill_the_frame_above_the_strip() -> None:
    for stacked in (False, True):
        (width, height), field = twin_part((1280, 720), 178, stacked, np.radians(75.0))
        across, down = (1, 2) if stacked else (2, 1)
        assert across * width + (across - 1) * GAP_PX in (1279, 1280)
        assert down * height + (down - 1) * GAP_PX in (541, 542)
        # pixels a radian against the whole picture's: the root of the area
        scale = (width / 2 / np.tan(field / 2)) / (640 / np.tan(np.radians(37.5)))
        assert scale == pytest.approx(np.sqrt(width * height / (1280 * 720)))


def test_the_strip_is_kept_free_only_under_an_overlay() -> None:
    options = StageOptions(twin="side")
    assert stage_spec(options, (1280, 720), overlay=True).options["clear_px"] == 178
    assert stage_spec(options, (1280, 720), overlay=False).options["clear_px"] == 0
    assert stage_spec(StageOptions(), (1280, 720), overlay=True).options["clear_px"] == 0


@pytest.mark.draws
def test_what_the_strip_covers_is_not_drawn_and_the_rest_is_the_same_picture(
    study: Study, plain: FrameSource
) -> None:
    spec = stage_spec(StageOptions(), SIZE, overlay=True)
    rows = SIZE[1] - spec.options["unseen_px"]
    with open_stage(study, "right", SIZE, **spec.options) as cut:
        for time_s in (9.0, 22.0):
            first, second = plain.frame(time_s).astype(int), cut.frame(time_s).astype(int)
            apart = np.abs(first - second)[:rows].max(axis=2)
            assert np.mean(apart > 2) < 0.005, "one camera: only roundings may differ"
            assert second[rows:].max() == 0 and first[rows:].max() > 0
    assert stage_spec(StageOptions(), SIZE, overlay=False).options["unseen_px"] == 0
    assert stage_spec(StageOptions(), SIZE, overlay=True, plain_too=True).options["unseen_px"] == 0
    assert stage_spec(StageOptions(twin="side"), SIZE, overlay=True).options["unseen_px"] == 0


def test_wrong_options_are_refused_all_at_once(study: Study, healthy_study: Study) -> None:
    wrong = {"view": "cabin", "look": "up", "twin": "mirror"}
    with pytest.raises(LatepullError) as caught, open_stage(study, "right", SIZE, **wrong):
        pass
    assert str(caught.value).splitlines() == [
        "--view: read cabin, wanted one of seat, chase, spectator",
        "--look: read up, wanted one of lead, ahead, ground, gaze",
        "--twin: read mirror, wanted one of side, stack, ghost",
    ]
    with pytest.raises(LatepullError, match="needs --view seat"), open_stage(
        study, "right", SIZE, view="chase", peripheral=True
    ):
        pass
    with pytest.raises(LatepullError, match="no fault"), open_stage(healthy_study, "right", SIZE, twin="side"):
        pass


def test_what_is_not_a_wing_pilots_plain_view_is_said() -> None:
    assert picture_words(StageOptions()) == ""
    assert "acuity" in picture_words(StageOptions(peripheral=True))
    assert picture_words(StageOptions(twin="side")).startswith("left: without the fault, right: with it")
    assert picture_words(StageOptions(view="chase")) == "seen from a chase aircraft"
