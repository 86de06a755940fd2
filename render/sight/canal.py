"""What the semicircular canals make of a rate of turn: its changes, not its steady part."""

from __future__ import annotations

import numpy as np
from scipy.signal import cont2discrete, lfilter

from render.frames import Array

# Time constants of the observer-model parameter set, J Neurophysiol 102:2232-2244 (2009), building on
# Young & Oman 1969 (NOTICING.md 2.1, published).
CANAL_S = 5.7
ADAPTATION_S = 80.0


def canal_filter(rate_radps: Array, step_s: float) -> Array:
    """The felt rate behind a true rate, (..., T), rad/s: H(s) = 5.7 s 80 s / ((5.7 s + 1)(80 s + 1)).

    Starts from rest. Discretised by the bilinear transform; exact to (step/5.7)^2 / 12.
    """
    num = [CANAL_S * ADAPTATION_S, 0.0, 0.0]
    den = [CANAL_S * ADAPTATION_S, CANAL_S + ADAPTATION_S, 1.0]
    b, a, _ = cont2discrete((num, den), step_s, method="bilinear")
    return np.asarray(lfilter(np.ravel(b), np.ravel(a), rate_radps, axis=-1))


def canal_step_response(time_s: Array) -> Array:
    """Felt rate after a step of one, closed form: (80 e^(-t/5.7) - 5.7 e^(-t/80)) / (80 - 5.7).

    From partial fractions of H(s)/s: (e^(-t/T1) T2 - e^(-t/T2) T1) / (T2 - T1).
    """
    fast, slow = np.exp(-time_s / CANAL_S), np.exp(-time_s / ADAPTATION_S)
    return np.asarray((ADAPTATION_S * fast - CANAL_S * slow) / (ADAPTATION_S - CANAL_S))
