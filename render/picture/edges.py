"""Smooth the stair steps of silhouettes on a finished frame.

An edge search on brightness: at a pixel that differs much from a neighbour, the edge between the two is followed
both ways to its ends; where it ends tells how far the true edge crosses the pixel, and the pixel takes so much of
the neighbour's colour. The idea is A. Reshetov, Morphological antialiasing (High Performance Graphics 2009) with
the sub-pixel offset of T. Lottes, FXAA (NVIDIA white paper 2009); written anew, compiled, in place.
The whole frame is searched: the aircraft's rectangles together hold most of it anyway, and trees and roofs gain.
"""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

Frame = NDArray[np.uint8]

CONTRAST = 24  # of 255, below which a step is left as it is
SEARCH_PX = 16  # how far an edge is followed each way


def smooth_edges(frame: Frame) -> int:
    """Smooth high-contrast edges of a frame (h, w, 3) in place; returns the pixels changed."""
    return int(_smooth(frame, CONTRAST, SEARCH_PX))


def warm_up() -> None:
    """Have the compiled code read now and not at the first frame."""
    smooth_edges(np.zeros((4, 4, 3), np.uint8))


@njit(cache=True, nogil=True)
def _smooth(frame, contrast, search):  # type: ignore[no-untyped-def]
    """Brightness, edges found on the untouched picture, then mixed from its copy."""
    height, width, _ = frame.shape
    light = np.empty((height, width), np.int16)
    for y in range(height):
        for x in range(width):
            light[y, x] = (frame[y, x, 0] + 2 * frame[y, x, 1] + frame[y, x, 2]) >> 2
    count = 0
    room = 1024
    where = np.empty((room, 4), np.int32)  # y, x, the neighbour's y, x
    mix = np.empty(room, np.int32)  # of 256
    span = np.empty(width, np.int16)
    for y in range(1, height - 1):
        # most pixels end here: a loop without branches, which the compiler does sixteen at a time
        for x in range(1, width - 1):
            up_down = max(max(light[y - 1, x], light[y + 1, x]), light[y, x])
            low_up_down = min(min(light[y - 1, x], light[y + 1, x]), light[y, x])
            high = max(max(light[y, x - 1], light[y, x + 1]), up_down)
            span[x] = high - min(min(light[y, x - 1], light[y, x + 1]), low_up_down)
        for x in range(1, width - 1):
            if span[x] < contrast:
                continue
            here = light[y, x]
            north, south = light[y - 1, x], light[y + 1, x]
            west, east = light[y, x - 1], light[y, x + 1]
            nw, ne = light[y - 1, x - 1], light[y - 1, x + 1]
            sw, se = light[y + 1, x - 1], light[y + 1, x + 1]
            # second differences: a lying edge is curved across rows, a standing one across columns
            lying = 2 * abs(north + south - 2 * here) + abs(ne + se - 2 * east) + abs(nw + sw - 2 * west)
            standing = 2 * abs(west + east - 2 * here) + abs(nw + ne - 2 * north) + abs(sw + se - 2 * south)
            dy, dx = 0, 0
            if lying >= standing:
                one, other = north, south
                dy = -1
            else:
                one, other = west, east
                dx = -1
            step = abs(one - here)
            neighbour = one
            if abs(other - here) > step:
                step = abs(other - here)
                neighbour = other
                dy, dx = -dy, -dx
            if 2 * step < contrast:
                continue
            # along the edge, in both directions, the mean of the pixel pair leaves the pair's own mean where the
            # edge ends
            middle = here + neighbour  # twice the mean
            ay, ax = abs(dx), abs(dy)
            reach0 = reach1 = search + 1
            end0 = end1 = 0
            for k in range(1, search + 1):
                py, px = y - k * ay, x - k * ax
                qy, qx = py + dy, px + dx
                if py < 0 or px < 0 or qy < 0 or qx < 0 or qy >= height or qx >= width:
                    reach0 = k
                    end0 = 0
                    break
                end0 = light[py, px] + light[qy, qx] - middle
                if 2 * abs(end0) >= step:
                    reach0 = k
                    break
            for k in range(1, search + 1):
                py, px = y + k * ay, x + k * ax
                qy, qx = py + dy, px + dx
                if py >= height or px >= width or qy < 0 or qx < 0 or qy >= height or qx >= width:
                    reach1 = k
                    end1 = 0
                    break
                end1 = light[py, px] + light[qy, qx] - middle
                if 2 * abs(end1) >= step:
                    reach1 = k
                    break
            nearest, end = (reach0, end0) if reach0 <= reach1 else (reach1, end1)
            if 2 * abs(end) < step:
                continue  # no end near enough: the edge is straight along the rows here
            # the pixel gives way only at the end where the edge crosses into it
            if (end < 0) == (2 * here - middle < 0):
                continue
            # the edge runs from half a pixel up at this end to half a pixel down at the other: cover of the
            # neighbour in this pixel's middle
            part = 128 - 128 * (2 * nearest - 1) // (reach0 + reach1 - 1)
            if part < 6:
                continue
            if count == room:
                grown = np.empty((2 * room, 4), np.int32)
                grown[:room] = where
                where = grown
                grown_mix = np.empty(2 * room, np.int32)
                grown_mix[:room] = mix
                mix = grown_mix
                room *= 2
            where[count, 0], where[count, 1], where[count, 2], where[count, 3] = y, x, y + dy, x + dx
            mix[count] = part
            count += 1
    taken = np.empty((count, 3), np.int32)
    for i in range(count):
        for c in range(3):
            taken[i, c] = frame[where[i, 2], where[i, 3], c]
    for i in range(count):
        y, x = where[i, 0], where[i, 1]
        for c in range(3):
            frame[y, x, c] = (frame[y, x, c] * (256 - mix[i]) + taken[i, c] * mix[i] + 128) >> 8
    return count
