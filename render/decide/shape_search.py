"""The search: pulls tried side by side, by differential evolution and then step by step, within limits of load factor.

Every draw is seeded: the same seed and budget give the same answer.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np
from scipy.optimize import differential_evolution

from render.decide.shape import (
    CLEAR_M_PER_S,
    CLEAR_S,
    LEAST_LOAD,
    LIKELY,
    NEVER_S,
    TOP_RAD,
    Frozen,
    Job,
    short_of_clearing,
    unlike_slots,
    with_demand,
)
from render.decide.shape_flights import Flights
from render.decide.shape_limits import Limits, Pull, least_load_factor, own_limits
from render.decide.shape_polish import Judged, polish
from render.frames import Array
from scenes.model import DEG, Loop, Scene

PEOPLE = 20  # pulls in a generation
DRAWS = 4  # times as many are drawn and measured for the first one
POLISH = 0.6  # part of a search's budget that is left to the steps from the best that evolution has found
TIGHTER = 0.995  # limits inside a search, so that rounding what it finds to 0.01 g keeps them
FINER = 5  # freeze points of the final check, to each one of the search
SETTLED = 2e-3  # of a scale: nearer to 1 it changes nothing that matters
PULL_COSTS = 2  # cases: what closing and measuring a pull takes
BARREN = 8  # generations without a pull that keeps the limits, after which a search gives up
LED = 2  # pulls led into the limits where none keeps them
ROUNDS = 3  # searches of one load factor, each with the freeze points the last one had missed
MISSED_S = 0.05  # of lateness, between freeze points
BETTER_S = 0.02  # less is no difference
LEAST_OVER = 1.02  # the least load factor of a trade, to the least that a plain pull closes with

Tell = Callable[[str, int, int], None]
"""Called with what is being worked on, cases done, cases granted."""


@dataclass(frozen=True, slots=True, eq=False)
class Trade:
    """The best pull found within one load factor; ``scene`` None: none was found that keeps all limits."""

    limits: Limits
    scene: Scene | None
    pull: Pull | None
    frozen: Frozen | None  # at the fine freeze points, every slot


@dataclass(frozen=True, slots=True, eq=False)
class Shape:
    """What a search found: the loop as it was, the trade over load factor, which of it is best (None: none)."""

    job: Job
    limits: Limits
    start_pull: Pull
    start: Frozen  # at the fine freeze points, every slot
    within: bool  # whether the loop as it was keeps the limits
    trade: tuple[Trade, ...]
    best: int | None
    cases: int
    seed: int


def fine_points(freeze_rad: Array, finer: int = FINER) -> Array:
    """Freeze points between those of a search, ``finer`` for each of its steps."""
    last = len(freeze_rad) - 1
    points: Array = np.interp(np.arange(last * finer + 1) / finer, np.arange(last + 1), freeze_rad)
    return points


def find_shape(
    job: Job, *, load_factor: float | None = None, onset_gps: float | None = None, slope_gprad: float | None = None,
    bend_gprad2: float | None = None, budget: int = 8000, seed: int = 1, steps: int = 4, tell: Tell | None = None,
    people: int = PEOPLE, flights: Flights | None = None,
) -> Shape:
    """Seek the pull whose worst freeze is least late, for ``steps`` load factors up to the greatest allowed.

    Where every freeze clears by itself within one, the least that does so is sought instead of higher ones.

    Limits not given are the scene's own. budget: freezes flown in all searches together; people: pulls in a
    generation; flights: who flies them, and keeps what is done (here and not, if not given).
    Raises LatepullError: the loop can't close within the load factor; FlightError: it can't be flown as it is.
    """
    from render.errors import FlightError

    flights = flights or Flights(job)
    start_pull = flights.measure([job.scene])[0]
    if start_pull.error is not None:
        raise FlightError(start_pull.error)
    limits = own_limits(start_pull, load_factor=load_factor, onset_gps=onset_gps, slope_gprad=slope_gprad,
                        bend_gprad2=bend_gprad2)
    least = least_load_factor(job, limits.load_factor)
    fine = fine_points(job.freeze_rad)
    start = flights.freeze([job.scene], fine)[0]
    seeds: list[Array] = [_sampled(job, start_pull)]
    plain, flown = plain_pulls(job, limits, start_pull, flights)
    seeds += plain
    lowest = 0.5 * (least + flown) if plain else LEAST_OVER * least
    ladder = np.geomspace(min(lowest, limits.load_factor), limits.load_factor, steps)
    if steps == 1:
        ladder = np.array([limits.load_factor])
    trade: list[Trade] = []
    spent = 2 * len(fine)
    for n in range(steps):
        most = _next(trade, ladder, least)
        mine = dataclasses.replace(limits, load_factor=most)
        share = max((budget - spent) // (steps - n), 0)
        search = Search(job, mine, start_pull, seed + n, share, f"within {most:.2f} g", tell, people, flights,
                        (spent, budget))
        found = search.run(seeds)
        spent += search.spent
        below = [item for item in trade if item.limits.load_factor < most and _score(item) < _score(found)]
        if below:
            # what keeps a lower limit keeps this one
            found = dataclasses.replace(min(below, key=_score), limits=mine)
        trade.append(found)
        if found.pull is not None:
            seeds.append(_sampled(job, found.pull))
    trade.sort(key=lambda item: item.limits.load_factor)
    best = None
    for n, item in enumerate(trade):
        ahead = start.score_s if best is None else _score(trade[best])
        if _score(item) < ahead - BETTER_S:
            best = n
    return Shape(job, limits, start_pull, start, start_pull.excess(limits) == 0.0, tuple(trade), best, spent, seed)


def plain_pulls(job: Job, limits: Limits, start: Pull, flights: Flights) -> tuple[list[Array], float]:
    """Pulls that rise evenly from the top on to a load factor that is then held, and keep the limits: the gentlest
    four, (D,) each, and the least load factor flown in them. ([], infinity) if none keeps them.
    """
    search = Search(job, limits, start, 0, 0, "", None)
    first = float(np.interp(TOP_RAD, start.angle_rad, start.flown_load))
    held = np.geomspace(max(2.0, 0.45 * limits.load_factor), limits.load_factor, 7)
    rise = np.array([0.5, 0.7, 0.95]) * limits.slope_gprad
    loads = np.array([np.clip(first + slope * (job.knots_rad - TOP_RAD), LEAST_LOAD, most)
                      for most in held for slope in rise])
    pulls = flights.measure(search.scenes(loads))
    good = [i for i, p in enumerate(pulls) if p.excess(search.tight) == 0.0]
    good.sort(key=lambda i: pulls[i].load_factor)
    return [_sampled(job, pulls[i]) for i in good[:4]], min((pulls[i].load_factor for i in good), default=np.inf)


def _next(trade: Sequence[Trade], ladder: Array, least: float) -> float:
    """The next load factor of a trade: up the ladder until every freeze clears, then between that and what fails."""
    clear = [item for item in trade if item.frozen is not None and bool(np.all(item.frozen.clears))]
    if not clear:
        return float(ladder[len(trade)])
    high = min(item.pull.load_factor for item in clear if item.pull is not None)
    low = max([least, *(item.limits.load_factor for item in trade if item not in clear)])
    return float(np.sqrt(min(low, high) * high))


def _score(item: Trade) -> float:
    return np.inf if item.frozen is None else item.frozen.score_s


def _sampled(job: Job, pull: Pull) -> Array:
    """A flown pull at the knots, (D,)."""
    loads: Array = np.interp(job.knots_rad, pull.angle_rad, pull.flown_load)
    return loads


class Search:
    """One search within one load factor."""

    def __init__(self, job: Job, limits: Limits, start: Pull, seed: int, budget: int, what: str,
                 tell: Tell | None, people: int = PEOPLE, flights: Flights | None = None,
                 of: tuple[int, int] = (0, 0)) -> None:
        """of: cases spent before this search, and granted to all."""
        self.job, self.limits, self.budget, self.what, self.tell = job, limits, budget, what, tell
        self.flights, self.before, self.granted = flights or Flights(job), of[0], of[1] or budget
        self.tight = Limits(*(getattr(limits, f.name) * TIGHTER for f in dataclasses.fields(limits)))
        loop = job.scene.script[job.loop]
        assert isinstance(loop, Loop)
        self.end_load = loop.load_factor[-1] * start.scale
        # a freeze that clears as much as the loop itself at its base leaves nothing to gain
        self.enough = CLEAR_S - max((loop.close_at_m or 0.0) - job.scene.floor_m, 0.0) / CLEAR_M_PER_S
        self.people = people
        self.rng = np.random.default_rng(seed)
        self.spent = 0
        self.barren = 0
        self.best_score, self.best_load = np.inf, np.array([])

    def scenes(self, loads: Array) -> list[Scene]:
        """Candidates as scenes; loads (N, D)."""
        return [with_demand(self.job, x, float(min(self.end_load, x[-1]))) for x in loads]

    def judge(self, loads: Array, always: bool = False, *, clearing: bool = False) -> Judged:
        """Pulls measured, and frozen if they keep the limits, or ``always``; the best of them is remembered.

        clearing: judged by how far each freeze is from clearing by itself instead.
        """
        loads, scenes, pulls = self._settled(loads)
        excess = np.array([p.excess(self.tight) for p in pulls])
        rows = [p.parts(self.tight) for p in pulls]
        parts = np.full((len(rows), max(len(row) for row in rows)), np.nan)
        for n, row in enumerate(rows):
            parts[n, : len(row)] = row
        good = np.flatnonzero(np.isfinite(excess) if always else excess == 0.0)
        late = np.full((len(rows), len(self.job.freeze_rad)), np.nan)
        frozen = self.flights.freeze([unlike_slots(scenes[i]) for i in good], self.job.freeze_rad)
        self.spent += len(good) * len(self.job.freeze_rad)
        for i, f in zip(good, frozen, strict=True):
            score = max(f.score_s, self.enough)
            late[i] = np.maximum(short_of_clearing(f, self.job.scene.floor_m) if clearing else f.scores_s, self.enough)
            if excess[i] == 0.0 and score < self.best_score:
                self.best_score, self.best_load = score, loads[i].copy()
        if self.tell is not None:
            self.tell(self.what, self.before + self.spent, self.granted)
        return Judged(parts, excess, late)

    def _settled(self, loads: Array) -> tuple[Array, list[Scene], list[Pull]]:
        """Pulls as they would be written: at the load factor they are flown at, so that closing hardly scales them.

        The scale comes in over the top, where a freeze answers to a hundredth of a g: what is judged is what is kept.
        """
        scenes = self.scenes(loads)
        pulls = self.flights.measure(scenes)
        off = [i for i, p in enumerate(pulls) if p.error is None and abs(p.scale - 1.0) > SETTLED]
        loads = loads.copy()
        for i in off:
            loads[i] *= pulls[i].scale
        again = self.scenes(loads[off])
        for i, scene, pull in zip(off, again, self.flights.measure(again), strict=True):
            scenes[i], pulls[i] = scene, pull
        self.spent += PULL_COSTS * (len(scenes) + len(off))
        return loads, scenes, pulls

    def scores(self, loads: Array) -> Array:
        """What each pull scores, (N,): beyond the limits, the worse the farther; within, its worst freeze."""
        found = self.judge(loads)
        inside = found.excess == 0.0
        self.barren = 0 if inside.any() else self.barren + 1
        beyond = NEVER_S + 10.0 + 100.0 * np.minimum(found.excess, 10.0)
        scores: Array = np.where(inside, found.late_s.max(axis=1), beyond)
        return scores

    def first(self, seeds: Sequence[Array]) -> Array:
        """The first generation: of many drawn, those that keep the limits best; (people, D)."""
        knots, most = self.job.knots_rad, self.limits.load_factor
        n = DRAWS * self.people
        u = np.clip((knots - knots[0]) / (330.0 * DEG - knots[0]), 0.0, 1.1)
        peak = self.rng.uniform(0.6, 1.0, (n, 1)) * most
        begin = LEAST_LOAD + self.rng.uniform(0.0, 1.0, (n, 1)) * (peak - LEAST_LOAD)
        power = np.exp(self.rng.uniform(-1.5, 1.0, (n, 1)))
        drawn = begin + (peak - begin) * u**power
        # half of them rise evenly from the top and are then held, or eased a little
        rise = self.rng.uniform(0.3, 1.0, (n, 1)) * self.limits.slope_gprad
        held = np.clip(self.rng.uniform(0.5, 1.0, (n, 1)) * most + rise * (knots - TOP_RAD) - 0.5 * most, 0.0, peak)
        held *= 1.0 - self.rng.uniform(0.0, 0.25, (n, 1)) * u
        drawn[::2] = held[::2]
        drawn *= 1.0 + 0.04 * self.rng.standard_normal(drawn.shape)
        near = [np.minimum(x, most) * (1.0 + 0.02 * i * self.rng.standard_normal(x.size))
                for x in seeds for i in range(4)]
        drawn = np.clip(np.concatenate([np.array(near), drawn]), LEAST_LOAD, most)
        excess = np.array([p.excess(self.tight) for p in self.flights.measure(self.scenes(drawn))])
        self.spent += PULL_COSTS * len(drawn)
        drawn = drawn[np.argsort(excess, kind="stable")[: self.people]]
        if excess.min() > 0.0:
            # none keeps the limits: what there is, led into them
            for i in range(min(LED, len(drawn))):
                drawn[i] = polish(self.judge, drawn[i], LEAST_LOAD, most,
                                  lambda: np.isfinite(self.best_score) or self.spent >= 0.5 * self.budget)
                if np.isfinite(self.best_score):
                    break
        return drawn

    def _done(self, budget: float) -> bool:
        return self._spent(budget) or self.barren >= BARREN

    def _spent(self, until: float) -> bool:
        return self.best_score <= self.enough or self.spent >= until

    def run(self, seeds: Sequence[Array]) -> Trade:
        """Search, check at finer freeze points, and search again with those that had been missed."""
        job, found = self.job, Trade(self.limits, None, None, None)
        part = self.budget / ROUNDS
        for n in range(ROUNDS):
            until = self.budget if n == ROUNDS - 1 else self.spent + max(part, 0.6 * (self.budget - self.spent))
            self.best_score = np.inf
            self._evolve(seeds if n == 0 else [self.best_load, *seeds], until)
            now = self._finish(job)
            if _score(now) < _score(found):
                found = now
            if now.frozen is None or now.frozen.score_s <= max(self.best_score, self.enough) + MISSED_S:
                break
            if self.spent >= self.budget:
                break
            more = _peaks(now.frozen)
            self.job = dataclasses.replace(self.job, freeze_rad=np.unique(np.concatenate([self.job.freeze_rad, more])))
        return found

    def _evolve(self, seeds: Sequence[Array], until: float) -> None:
        most = self.limits.load_factor
        people = self.first(seeds)
        split = self.spent + (1.0 - POLISH) * (until - self.spent)
        if not self._done(split):
            differential_evolution(
                lambda x: self.scores(x.T), [(LEAST_LOAD, most)] * people.shape[1], init=people, maxiter=200,
                mutation=(0.4, 0.9), recombination=0.8, rng=self.rng, polish=False, tol=0.0, vectorized=True,
                updating="deferred", callback=lambda intermediate_result: self._done(split),
            )
        elif not np.isfinite(self.best_score):
            self.scores(people)
        # first towards a pull whose every freeze clears; where there is none, towards the least late
        for clearing in (True, False):
            if np.isfinite(self.best_score) and not self._spent(until):
                half = until if not clearing else 0.5 * (self.spent + until)
                polish(partial(self.judge, clearing=clearing), self.best_load, LEAST_LOAD, most,
                       partial(self._spent, half))

    def _finish(self, job: Job) -> Trade:
        """The best pull written as it is flown (scale near 1), rounded, measured, and frozen at the fine points."""
        none = Trade(self.limits, None, None, None)
        if self.best_score > NEVER_S:
            return none
        pull = self.flights.measure(self.scenes(self.best_load[None]))[0]
        flown = self.best_load * pull.scale
        end = float(min(self.end_load, self.best_load[-1])) * pull.scale
        points, kept = fine_points(job.freeze_rad), none
        for digits in (2, 3, 4):
            scene = with_demand(job, np.round(flown, digits), round(end, digits))
            pull = self.flights.measure([scene])[0]
            if pull.excess(self.limits) == 0.0:
                self.spent += len(points)
                now = Trade(self.limits, scene, pull, self.flights.freeze([scene], points)[0])
                kept = min((kept, now), key=_score)
                if _score(kept) < self.best_score + MISSED_S:
                    break
        return kept


def _peaks(frozen: Frozen) -> Array:
    """Freeze points where the lateness of the likely observer is greatest: the two worst of the fine ones."""
    late = np.where(frozen.clears, -np.inf, frozen.lateness_s[:, LIKELY])
    late = np.where(np.isnan(late), np.inf, late)
    return frozen.freeze_rad[np.argsort(-late, kind="stable")[:2]]
