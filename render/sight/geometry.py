"""The picture at a pilot's eye, from true geometry alone: no psychology in here.

All functions are vectorised over leading axes (..., T). Earth axes north-east-down ``e``, body axes ``b``.
The eye frame ``c`` is a camera's: x right, y down, z along the line of sight; the head stays upright
in the aircraft::

        own aircraft  ->  x_b                     looking along the right wing:
        wing          ->  y_b = z_c               aircraft pitch rolls the scene about z_c,
        body down     ->  z_b = y_c               aircraft roll slides it up and down y_c

Formula numbers are those of section 0 of NOTICING.md (closed form, derived there).
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from render.frames import Array, quat_rotate

Mask = NDArray[np.bool_]
HeightAt = Callable[[Array, Array], Array]
"""Ground height above the field datum (m) at north, east (m), arrays of any one shape."""

# Depression of the patches under level ground. 45 deg is where sinking moves a point fastest (0.9); the
# others span the ground a wing pilot has in view. Eight azimuths: symmetric about the display line.
PATCH_DEPRESSION_RAD = np.radians([55.0, 35.0, 18.0])
PATCH_AZIMUTHS = 8

# Field of the two eyes together about the gaze: up 60, down 70-75, to each side 100-110 deg (1.36).
FIELD_UP_RAD, FIELD_DOWN_RAD, FIELD_SIDE_RAD = np.radians([60.0, 72.0, 100.0])

MAR_FOVEA_RAD = np.radians(1.0 / 60.0)  # 1.32
MAR_SLOPE = 1.5 / 60.0  # rad per rad: 1.32-1.65 arcmin per degree (1.32), the middle of it

_DOWN = np.array([0.0, 0.0, 1.0])


def dot(a: Array, b: Array) -> Array:
    """Scalar products over the last axis, (...). ``einsum`` is several times faster here than a sum of products."""
    return np.asarray(np.einsum("...i,...i->...", a, b))


def length(vec: Array) -> Array:
    """Lengths of vectors, (...)."""
    return np.sqrt(dot(vec, vec))


def unit(vec: Array) -> Array:
    """Unit vectors (..., 3); a zero vector stays zero."""
    norm = length(vec)[..., None]
    return np.asarray(vec / np.where(norm > 0.0, norm, 1.0))


def angle_between(a: Array, b: Array) -> Array:
    """Angle between vectors, rad, (...). Exact near 0 and pi, unlike acos of a dot product.

    Source: W. Kahan, 2 atan2(|a - b|, |a + b|) for unit a, b. Formula 0.12.
    """
    a, b = unit(a), unit(b)
    return np.asarray(2.0 * np.arctan2(length(a - b), length(a + b)))


def eye_position(pos_e_m: Array, quat_eb: Array, eye_forward_m: float, eye_up_m: float) -> Array:
    """Where the pilot's eye is, (..., 3): centre of gravity plus the airframe's eye offset in body axes."""
    return np.asarray(pos_e_m + quat_rotate(quat_eb, np.array([eye_forward_m, 0.0, -eye_up_m])))


def line_of_sight(eye_e_m: Array, quat_eb: Array, target_e_m: Array | None) -> Array:
    """Unit vector of the gaze in earth axes, (..., 3): to the target, or ahead along the body axis."""
    if target_e_m is None:
        return quat_rotate(quat_eb, np.array([1.0, 0.0, 0.0]))
    return unit(target_e_m - eye_e_m)


def eye_axes(los_e: Array, quat_eb: Array) -> Array:
    """Eye frame, rows x right, y down, z gaze in earth axes, (..., 3, 3); turns earth vectors into ``c``.

    The head's up is the part of the body's up across the gaze. Straight up or down (within about
    2 deg) that has no direction; there the head is thrown back or bowed: the body's forward axis serves.
    """
    down_b = quat_rotate(quat_eb, _DOWN)
    forward_b = quat_rotate(quat_eb, np.array([1.0, 0.0, 0.0]))
    along = dot(down_b, los_e)[..., None]
    across = down_b - along * los_e
    # Looking up the image's down is forward, looking down it is aft.
    fallback = -np.sign(along) * forward_b
    fallback = fallback - dot(fallback, los_e)[..., None] * los_e
    y = unit(np.where(np.abs(along) > 0.9994, fallback, across))
    x = np.cross(y, los_e)
    return np.stack([x, y, los_e], axis=-2)


def down_in_eye(axes: Array) -> Array:
    """The earth's down as the eye has it, (..., 3): the horizon is the great circle across it."""
    return np.asarray(axes[..., :, 2])


def horizon_lean_rad(axes: Array) -> Array:
    """Lean of the horizon in the eye's picture, (-pi, pi]: 0 level, positive with its right end raised.

    Looking along the wing this is the pitch angle up to sign (0.11). Undefined for a gaze straight up or
    down; there the horizon is 90 deg away.
    """
    down = down_in_eye(axes)
    return np.asarray(np.arctan2(down[..., 0], down[..., 1]))


def horizon_eccentricity_rad(los_e: Array) -> Array:
    """Angle from the gaze to the nearest point of the horizon (0.12), rad."""
    return np.asarray(np.arcsin(np.clip(np.abs(los_e[..., 2]), 0.0, 1.0)))


def scene_eccentricity_rad(los_e: Array) -> Array:
    """Angle from the gaze to the nearest part of the ground, rad: 0 where the gaze itself meets it."""
    return np.asarray(np.arcsin(np.clip(-los_e[..., 2], 0.0, 1.0)))


def turning_c_radps(rate_b_radps: Array, quat_eb: Array, axes: Array) -> Array:
    """How the eye turns with the aircraft, in eye axes, (..., 3); the far scene turns the other way.

    Component z is the roll of the scene about the line of sight, x and y its slide (0.11). The gaze's own
    slow movement within the cockpit is left out.
    """
    rate_e = quat_rotate(quat_eb, rate_b_radps)
    return np.asarray(np.einsum("...ij,...j->...i", axes, rate_e))


def mar_rad(eccentricity_rad: Array) -> Array:
    """Minimum resolvable angle, linear in eccentricity (1.32: Guenter et al 2012), rad."""
    return np.asarray(MAR_FOVEA_RAD + MAR_SLOPE * eccentricity_rad)


def in_field(dir_c: Array) -> Mask:
    """Whether directions in the eye frame lie in the field of the two eyes (1.36), bool (...).

    No canopy sill, wing, helmet or mask: there is no published value that fits all.
    """
    x, y, z = dir_c[..., 0], dir_c[..., 1], dir_c[..., 2]
    flat = np.sqrt(x * x + z * z)
    # Angles compared by their cosine and tangent: this runs over every patch.
    side = z >= np.cos(FIELD_SIDE_RAD) * flat
    return np.asarray(side & (y <= np.tan(FIELD_DOWN_RAD) * flat) & (y >= -np.tan(FIELD_UP_RAD) * flat))


def height_over_ground_m(eye_e_m: Array, height_at: HeightAt) -> Array:
    """Eye height above the ground underneath, at least 0.5 m, (...)."""
    return np.maximum(-eye_e_m[..., 2] - height_at(eye_e_m[..., 0], eye_e_m[..., 1]), 0.5)


def ground_patches(eye_e_m: Array, height_m: Array, height_at: HeightAt, display_line_rad: float | Array) -> Array:
    """Vectors from the eye to patches laid on the ground around it, (..., P, 3), earth axes.

    They are laid at fixed depressions and azimuths, so that patch p of the faulted flight is compared with
    patch p of the healthy one. ``display_line_rad``: the azimuth they are symmetric about, fixed for a flight
    (a scalar, or broadcastable against the leading axes). Hidden ground (hills in front) isn't found.
    """
    azimuth = np.asarray(display_line_rad)[..., None] + np.arange(PATCH_AZIMUTHS) * (2.0 * np.pi / PATCH_AZIMUTHS)
    reach = height_m[..., None] / np.tan(PATCH_DEPRESSION_RAD)  # (..., D)
    flat = (*height_m.shape, PATCH_DEPRESSION_RAD.size * PATCH_AZIMUTHS)
    north = (reach[..., :, None] * np.cos(azimuth)[..., None, :]).reshape(flat)
    east = (reach[..., :, None] * np.sin(azimuth)[..., None, :]).reshape(flat)
    ground = height_at(eye_e_m[..., None, 0] + north, eye_e_m[..., None, 1] + east)
    down = np.maximum(-eye_e_m[..., None, 2] - ground, 0.1)
    return np.stack([north, east, down], axis=-1)


def translation_flow_radps(vec_e_m: Array, vel_e_mps: Array) -> Array:
    """Image speed of ground points from travel alone (not turning), (..., P), rad/s: speed across over distance.

    vec_e_m: (..., P, 3); vel_e_mps: (..., 3). Abeam in level flight it is (V/h) sin(depression) (0.7, 0.8).
    """
    range2 = dot(vec_e_m, vec_e_m)
    along = np.einsum("...pi,...i->...p", vec_e_m, vel_e_mps)
    speed2 = dot(vel_e_mps, vel_e_mps)[..., None]
    return np.asarray(np.sqrt(np.maximum(speed2 * range2 - along**2, 0.0)) / range2)


def elevation_drift_radps(vec_e_m: Array, vel_e_mps: Array) -> Array:
    """Rate of the depression of ground points below the horizon, (..., P), rad/s; rising points negative.

    Abeam it is -(s/h) sin cos of the depression (0.9), so on level ground it says what h/s says.
    """
    flat = np.hypot(vec_e_m[..., 0], vec_e_m[..., 1])
    toward = np.einsum("...pi,...i->...p", vec_e_m[..., :2], vel_e_mps[..., :2]) / flat
    range2 = dot(vec_e_m, vec_e_m)
    return np.asarray((-flat * vel_e_mps[..., None, 2] + vec_e_m[..., 2] * toward) / range2)


def splay_rad(offset_m: Array, height_m: Array) -> Array:
    """Splay of a ground line along the track at a lateral offset, rad (0.10; Warren/Flach form)."""
    return np.asarray(np.arctan2(offset_m, height_m))


def splay_rate_radps(offset_m: Array, height_m: Array, offset_rate_mps: Array, climb_mps: Array) -> Array:
    """Rate of splay, rad/s (0.10). On level ground at steady offset it carries hdot/h and nothing else."""
    splay = splay_rad(offset_m, height_m)
    return np.asarray(
        -climb_mps / height_m * np.sin(splay) * np.cos(splay) + offset_rate_mps / height_m * np.cos(splay) ** 2
    )


def time_to_ground_s(height_m: Array, sink_mps: Array) -> Array:
    """First-order time to the ground h/s (0.6), s; infinity where there is no sink."""
    sinking = np.where(sink_mps > 1e-6, sink_mps, 1.0)
    return np.where(sink_mps > 1e-6, height_m / sinking, np.inf)


def direction_b(vec_e_m: Array, quat_eb: Array) -> Array:
    """Earth vectors in body axes, (..., 3): where in the canopy something stands (0.13)."""
    conj = quat_eb * np.array([1.0, -1.0, -1.0, -1.0])
    return quat_rotate(conj, vec_e_m)


def masked_median(values: Array, mask: Mask) -> Array:
    """Median over the last axis of the values the mask lets through, (...); 0 where there is none."""
    ordered = np.sort(np.where(mask, values, np.inf), axis=-1)
    count = np.sum(mask, axis=-1)
    low = np.maximum((count - 1) // 2, 0)[..., None]
    high = np.minimum(np.maximum(count // 2, 0), values.shape[-1] - 1)[..., None]
    pair = np.take_along_axis(ordered, low, -1) + np.take_along_axis(ordered, high, -1)
    return np.where(count > 0, 0.5 * pair[..., 0], 0.0)
