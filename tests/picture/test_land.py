"""The land as drawn: every shader is there, hills where the margin has them, true sizes, the day's light and haze."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import matplotlib
import numpy as np
import pytest

from render.picture.land import Land
from scenes.model import Day
from terrain.cover import cover_of
from terrain.ground import ground_names, read_ground
from terrain.land import land_of
from terrain.pattern import place_at
from tests.picture.lens import Lens, drawn

pytestmark = pytest.mark.draws

DAY = Day()


@pytest.mark.parametrize("name", ground_names())
def test_every_shader_draws(name: str) -> None:
    """A shader that does not compile leaves its actor out without an error."""
    land = Land(read_ground(name), DAY, 1)
    with Lens(land) as lens:
        kinds = {"objects": land.object_actors, "sky": land.sky_actors, "shadows": land.shadow_actors}
        kinds |= {"trees": land.tree_actors} | {f"ground {k}": [a] for k, a in enumerate(land.ground_actors)}
        for kind, actors in kinds.items():
            lens.show(*actors)
            seen = max(
                int(drawn(lens.look(eye, bearing, down)).sum())
                for eye, bearing, down in (((-500.0, 0.0, -700.0), 350.0, -20.0), ((600.0, 900.0, -60.0), 250.0, -5.0))
            )
            assert seen > 30, f"{kind} of {name}: {seen} pixels"
        lens.show()
        assert drawn(lens.look((0.0, 0.0, -100.0), 350.0, 0.0)).all()


def test_hills_in_the_picture_are_the_hills_of_the_margin() -> None:
    """Depth read back against ``height_at``: within 2.4 km of the display centre to 1 m, within 4.8 km to 4 m.

    The mesh has the ground's own corners there; what is left is the bend of a 100 m cell cut in two.
    """
    ground = read_ground("hills", 3)
    land = Land(ground, DAY, 3)
    with Lens(land, near_m=20.0) as lens:
        lens.show(*land.ground_actors)
        far = 0
        for bearing in (10.0, 130.0, 250.0):
            lens.look((0.0, 0.0, -900.0), bearing, -20.0)
            at = lens.places()
            off = np.abs(at[..., 2] - ground.height_at(at[..., 1], at[..., 0]))
            out = np.hypot(at[..., 0], at[..., 1])
            assert np.nanmax(off[out < 2400.0]) < 1.0
            assert np.nanmax(off[out < 4800.0]) < 4.0
            far += int((at[..., 2][out < 4000.0] > 40.0).sum())
        assert far > 500  # it was hills that were compared


def test_the_skyline_is_where_a_ray_first_clears_the_hills() -> None:
    ground = read_ground("hills", 3)
    land = Land(ground, DAY, 3)
    eye_up = 20.0
    with Lens(land, field_deg=30.0) as lens:
        lens.show(*land.ground_actors)
        seen = drawn(lens.look((0.0, 0.0, -eye_up), 35.0, 0.0))
        away = np.arange(50.0, 14_000.0, 10.0)
        for column in range(5, 400, 30):
            ray = lens.rays()[150, column]
            side = ray[:2] / np.hypot(ray[0], ray[1])
            angle = np.max((ground.height_at(away * side[1], away * side[0]) - eye_up) / away)
            slant = np.hypot(ray[0], ray[1])  # of unit depth
            row = 150.0 - lens.focal_px * angle * slant
            assert np.argmax(seen[:, column]) == pytest.approx(row, abs=1.5)
    assert ground.height_at(away * side[1], away * side[0]).max() > 60.0


@pytest.mark.parametrize("height_m", [15.0, 300.0, 2100.0])
def test_horizon_is_level_with_the_eye_and_has_no_seam(height_m: float) -> None:
    """The level land ends 60 km out, hidden in haze that has the sky's colour at the horizon."""
    land = Land(read_ground("heath"), DAY, 1)
    with Lens(land) as lens:
        lens.show(*land.ground_actors)
        ground = drawn(lens.look((0.0, 0.0, -height_m), 0.0, 0.0))
        lens.show()
        whole = lens.look((0.0, 0.0, -height_m), 0.0, 0.0).astype(int)
    rows = np.argmax(ground[:, 20:380], axis=0)
    dip = lens.focal_px * height_m / 60_000.0
    assert np.all(np.abs(rows - 150.0 - dip) < 1.01)
    if height_m > 100.0:  # lower down a pixel below the horizon is near and clear
        band = whole[148 : 151 + int(dip), 200]
        assert np.abs(np.diff(band, axis=0)).max() <= 4


def test_runway_has_its_width_and_lies_where_the_recipe_says() -> None:
    ground = read_ground("heath")
    field = land_of(ground.recipe, 1).airfield
    assert field is not None
    land = Land(ground, DAY, 1)
    north, east = field.north_east(-200.0, 0.0)
    with Lens(land, near_m=5.0) as lens:
        lens.show(*land.ground_actors)
        picture = lens.look((float(north), float(east), -150.0), float(np.degrees(field.heading_rad)), -89.999)
    metre = lens.focal_px / 150.0
    white = picture[150].min(axis=-1).astype(int)  # grass is never as bright in blue
    columns = np.nonzero(white > 170)[0] + 0.5
    left, right = columns[columns < 180].mean(), columns[columns > 220].mean()
    # Side stripes 0.9 m wide, 0.3 m in from the edge.
    assert (right - left) / metre == pytest.approx(field.width_m - 1.5, abs=0.5)
    assert (left + right) / 2.0 == pytest.approx(200.0, abs=0.7)


def test_a_hangar_has_its_size_in_pixels() -> None:
    ground = read_ground("heath")
    boxes = cover_of(ground, 1).boxes
    land = Land(ground, DAY, 1)
    k = int(np.argmax(boxes.kind == "hangar"))
    with Lens(land, field_deg=20.0) as lens:
        lens.show(*land.object_actors)
        bearing = float(np.degrees(boxes.bearing_rad[k])) - 90.0
        eye = (
            float(boxes.north_m[k]) - 300.0 * np.cos(np.radians(bearing)),
            float(boxes.east_m[k]) - 300.0 * np.sin(np.radians(bearing)),
            -30.0,
        )
        seen = drawn(lens.look(eye, bearing, -3.0))
        corners = []
        for along in (-1.0, 1.0):
            for across in (-1.0, 1.0):
                north, east = boxes.corner(along, across)
                corners.append([east[k], north[k], boxes.height_m[k]])
        columns = lens.pixel(np.array(corners))[:, 0]
    row = int(lens.pixel(np.array([boxes.east_m[k], boxes.north_m[k], 4.0]))[1])
    line = np.nonzero(seen[row, int(columns.min()) - 8 : int(columns.max()) + 8])[0] + int(columns.min()) - 8
    assert line.min() == pytest.approx(columns.min(), abs=1.0)
    assert line.max() + 1 == pytest.approx(columns.max(), abs=1.0)
    assert boxes.length_m[k] == 52.0


def test_painted_hedges_lie_where_the_plan_has_them() -> None:
    """The shader's plan against terrain/pattern.py, at places all over a picture from above."""
    ground = read_ground("farmland", 2)
    plan = land_of(ground.recipe, 2).plan
    land = Land(ground, DAY, 2)
    with Lens(land, near_m=50.0) as lens:
        lens.show(*land.ground_actors)
        picture = lens.look((-1500.0, 400.0, -700.0), 0.0, -89.999).astype(int).sum(axis=-1)
        at = lens.places()
    place = place_at(plan, at[..., 1], at[..., 0])
    open_field = ~place.wood & (place.road_m > 12.0)
    hedge, inside = open_field & (place.edge_m < 0.7), open_field & (place.edge_m > 12.0)
    assert hedge.sum() > 300
    fields = {key: float(np.median(picture[inside & (place.key == key)])) for key in np.unique(place.key[inside])}
    known = hedge & np.isin(place.key, list(fields))
    darker = [picture[i, j] < 0.9 * fields[place.key[i, j]] for i, j in np.argwhere(known)]
    assert np.mean(darker) > 0.97
    # ... and not a few metres beside them
    beside = open_field & (np.abs(place.edge_m - 8.0) < 1.0) & np.isin(place.key, list(fields))
    assert np.mean([picture[i, j] < 0.9 * fields[place.key[i, j]] for i, j in np.argwhere(beside)]) < 0.2


def test_the_same_eye_gives_the_same_picture_whatever_was_drawn_before() -> None:
    ground = read_ground("farmland")
    with Lens(Land(ground, DAY, 1)) as lens:
        one = lens.look((100.0, -200.0, -90.0), 350.0, -5.0)
        lens.look((900.0, 700.0, -700.0), 80.0, -40.0)
        assert np.array_equal(one, lens.look((100.0, -200.0, -90.0), 350.0, -5.0))
    with Lens(Land(ground, DAY, 1)) as lens:
        assert np.array_equal(one, lens.look((100.0, -200.0, -90.0), 350.0, -5.0))


def test_slopes_toward_the_sun_are_brighter() -> None:
    ground = read_ground("hills", 3)
    bright = {}
    for bearing in (90.0, 270.0):
        land = Land(
            ground, replace(DAY, sun_from_rad=float(np.radians(bearing)), sun_height_rad=0.3, visibility_m=1e5), 3
        )
        with Lens(land, near_m=20.0) as lens:
            lens.show(*land.ground_actors)
            bright[bearing] = lens.look((500.0, 2500.0, -2500.0), 0.0, -89.999).astype(float).sum(axis=-1)
            at = lens.places()
    slope = (ground.height_at(at[..., 1], at[..., 0] + 50.0) - ground.height_at(at[..., 1], at[..., 0] - 50.0)) / 100.0
    west, east = slope > 0.05, slope < -0.05  # falling toward the west, toward the east
    assert west.sum() > 500 and east.sum() > 500
    afternoon = bright[270.0] / bright[90.0]
    assert np.median(afternoon[west]) > 1.06
    assert np.median(afternoon[east]) < 0.94


def test_a_shadow_lies_where_the_sun_says() -> None:
    """A hangar's shadow reaches ridge height / tan(sun's height) beyond its ridge, away from the sun."""
    ground = read_ground("heath")
    boxes = cover_of(ground, 1).boxes
    day = replace(DAY, sun_from_rad=float(np.radians(170.0)), sun_height_rad=float(np.radians(35.0)))
    land = Land(ground, day, 1)
    k = int(np.argmax(boxes.kind == "hangar"))
    with Lens(land, near_m=20.0) as lens:
        solid = land.ground_actors
        lens.show(*solid)
        eye = (float(boxes.north_m[k]), float(boxes.east_m[k]), -200.0)
        bare = lens.look(eye, 0.0, -89.999).astype(int).sum(axis=-1)
        lens.show(*solid, *land.shadow_actors)
        shaded = lens.look(eye, 0.0, -89.999).astype(int).sum(axis=-1)
        at = lens.places()
    dark = (bare - shaded > 60) & (np.hypot(at[..., 0] - eye[1], at[..., 1] - eye[0]) < 60.0)
    away = np.array([-np.sin(day.sun_from_rad), -np.cos(day.sun_from_rad)])
    reach = at[..., :2] @ away
    tops = []
    for along, across, up in (
        (-1, 0, True),
        (1, 0, True),
        (1, 1, False),
        (-1, 1, False),
        (1, -1, False),
        (-1, -1, False),
    ):
        north, east = boxes.corner(along, across)
        high = boxes.height_m[k] + (boxes.ridge_m[k] if up else 0.0)
        tops.append(np.array([east[k], north[k]]) @ away + high / np.tan(np.radians(35.0)))
    assert reach[dark].max() == pytest.approx(max(tops), abs=1.2)


def test_haze_follows_koschmieder() -> None:
    """Colour less the haze's own falls as exp(-3.912 d / visibility). Source: Koschmieder 1924, WMO-No. 8."""
    contrast = {}
    for visibility in (10e3, 20e3):
        land = Land(read_ground("heath"), replace(DAY, visibility_m=visibility), 1)
        assert land.light.extinction_per_m * visibility == pytest.approx(3.912)
        with Lens(land) as lens:
            lens.show(*land.ground_actors)
            picture = lens.look((0.0, 0.0, -600.0), 180.0, 0.0).astype(float)
            distance = np.linalg.norm(lens.places() - np.array([0.0, 0.0, 600.0]), axis=-1)
        rim = picture[np.argmax(drawn(picture.astype(np.uint8))[:, 200]) + 1, 200]
        near = np.abs(distance - 4000.0) < 600.0
        contrast[visibility] = float(np.mean(rim[2] - picture[near][:, 2])), float(distance[near].mean())
    (thick, d), (thin, _) = contrast[10e3], contrast[20e3]
    assert thick / thin == pytest.approx(np.exp(-3.912 * d * (1 / 10e3 - 1 / 20e3)), rel=0.06)


def test_water_is_level() -> None:
    ground = read_ground("coast")
    shore = land_of(ground.recipe, 1).plan.shore
    assert shore is not None
    land = Land(ground, DAY, 1)
    with Lens(land, near_m=20.0) as lens:
        lens.show(*land.ground_actors)
        lens.look((1500.0, 0.0, -300.0), 350.0, -20.0)
        at = lens.places()
    out = shore.seaward_m(at[..., 1], at[..., 0])
    near = np.hypot(at[..., 0], at[..., 1]) < 6000.0
    sea = at[..., 2][(out > 5.0) & near]
    assert len(sea) > 10_000
    assert np.abs(sea + shore.below_m).max() < 0.5
    assert ground.height_at(0.0, 0.0) == 0.0


def test_cloud_lies_at_its_base_and_is_seen_from_both_sides() -> None:
    land = Land(read_ground("heath"), replace(DAY, cloud_base_m=900.0), 1)
    assert land.cloud_actor is not None
    with Lens(land, near_m=5.0) as lens:
        for height_m, up in ((300.0, 30.0), (1500.0, -30.0)):
            lens.show()
            with_cloud = lens.look((0.0, 0.0, -height_m), 20.0, up).astype(int)
            lens.show(*(actor for actor in land.actors if actor is not land.cloud_actor))
            without = lens.look((0.0, 0.0, -height_m), 20.0, up).astype(int)
            changed = np.abs(with_cloud - without).sum(axis=-1) > 20
            assert 0.1 < changed.mean() < 0.9  # broken cloud
        lens.show()
        below = lens.look((0.0, 0.0, -300.0), 20.0, -30.0)
        lens.show(*(actor for actor in land.actors if actor is not land.cloud_actor))
        assert np.array_equal(below, lens.look((0.0, 0.0, -300.0), 20.0, -30.0))  # none below its base
    assert Land(read_ground("heath"), DAY, 1).cloud_actor is None


def test_a_real_relief_is_drawn_without_an_airfield() -> None:
    """matplotlib's sample heights (USGS), see tests/terrain/test_elevation.py."""
    ground = read_ground(str(Path(matplotlib.get_data_path()) / "sample_data" / "jacksboro_fault_dem.npz"))
    land = Land(ground, DAY, 1)
    with Lens(land, near_m=20.0) as lens:
        lens.show(*land.ground_actors)
        lens.look((0.0, 0.0, -900.0), 330.0, -25.0)
        at = lens.places()
    off = np.abs(at[..., 2] - ground.height_at(at[..., 1], at[..., 0]))
    near = np.hypot(at[..., 0], at[..., 1]) < 2400.0
    assert near.sum() > 10_000
    # The mesh has the heights' own corners, 75 m apart; left is the bend of a cell cut in two, on slopes up to 60 %.
    assert np.percentile(off[near], 90) < 1.5
    assert off[near].max() < 12.0


def test_trees_outside_the_field_are_left_out_without_a_change_of_the_picture() -> None:
    land = Land(read_ground("farmland"), DAY, 1)
    eye, bearing = np.array([100.0, -200.0, -90.0]), np.radians(350.0)
    with Lens(land) as lens:
        whole = lens.look((100.0, -200.0, -90.0), 350.0, 0.0)
        count = land.trees_drawn
        corner = np.arctan(np.hypot(200.0, 150.0) / lens.focal_px)
        land.set_eye(eye, np.array([np.cos(bearing), np.sin(bearing), 0.0]), float(corner))
        assert land.trees_drawn < 0.6 * count
        assert np.array_equal(lens.again(), whole)
