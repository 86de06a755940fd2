"""What a page says it rests on: thresholds with their status, the works behind them, what the scene assumes."""

from __future__ import annotations

import math
from dataclasses import dataclass

from render.output.words import Units, cue_words
from render.sight.observers import TABLE, TECHNIQUE, Figure, source
from render.types import OBSERVERS, Study
from scenes.model import Power

# Works behind the ids that the thresholds name (the project's own numbering). A bridge or a rule says so itself.
WORKS = {
    "1.2": "Regan & Hamstra 1993, Vision Res 33:447-462: time to contact told apart in the fovea",
    "1.8": "Schiff & Detwiler 1979, Perception 8:647-658: long times to contact are underestimated",
    "1.10": "McKee & Nakayama 1984, Vision Res 24:25-32: speed told apart in the periphery",
    "1.11": "De Bruyn & Orban 1988, Vision Res 28:1323-1335: speed and direction of dot fields",
    "1.13": "Gottsdanker, Frick & Lockard 1961, Br J Psychol 52:31-42: gradual speed change is harder than a step",
    "1.15": "Werkhoven, Snippe & Toet 1992, Vision Res 32:2313-2329: modulated speed",
    "1.26": "Harris & Lott 1995, Visual Neuroscience 12:673-682: visual rotation, worst along the line of sight",
    "1.27": "Nesti et al. 2014 and 2015, Exp Brain Res (233:3553-3564): differences of rotation rate",
    "1.29": "general psychophysics of line orientation, no single work",
    "1.30": "a bridge from line orientation off the fovea (Sally & Gurnsey 2003, Vision Res 43:1375-1385) to a horizon",
    "1.42": "Williams 1985, Human Factors 27:221-227: a hard task in the fovea narrows the field",
    "1.46": "unattended events in simulated flight are missed (NASA; Haines 1991)",
    "1.47": "Wickens & Alexander 2009, Int J Aviat Psych 19:182-199: attentional tunnelling",
    "1.48": "Svard, Bargman & Victor 2021, Accid Anal Prev 150:105853: evidence falls off the gaze",
    "1.49": "peripheral vision in brake reactions in crashes, HFES 2021: evidence falls linearly off the gaze",
    "1.50": "Maddox & Kiefer 2012, HFES 56:700-704: looming in the laboratory against crashes",
    "1.51": "position of a reference (Westheimer and others); scatter of a held slot, no single work",
    "2.3": "Benson, Hutt & Brown 1989, Aviat Space Environ Med 60:205-213: thresholds of felt rotation",
    "2.4": "Grabherr et al. 2008, Exp Brain Res 186:677-681: felt rotation against duration",
    "2.7": "Valente Pais et al. 2012, J Guid Control Dyn: thresholds rise in an active task",
    "2.10": "Nesti et al. 2014, Exp Brain Res 232:303-314: differences of vertical acceleration",
    "2.11": "vertical vibration told apart, Vibration 3(2):116-131, 2020",
    "2.12": "Keramidas et al. 2024, J Neurophysiol: sustained g can be learnt to be judged",
    "3.15": "a stack of decision, choice, movement and aircraft lag; built for this tool",
}
RANK = {"published": 0, "from memory": 1, "guess": 2}
STATUS_WORDS = {
    "published": "read in the work named",
    "from memory": "the work exists, the number is remembered",
    "guess": "an engineering bridge, no source",
}


@dataclass(frozen=True, slots=True)
class Threshold:
    """One cue's row: the value of each observer with its status."""

    cue: str
    used: bool  # whether an observer of this page noticed by it
    values: tuple[tuple[str, str], ...]  # (value with unit, status) of early, likely, late
    technique: tuple[str, str]
    ids: str


@dataclass(frozen=True, slots=True)
class Assumption:
    """One thing taken for granted: what, the value, where it comes from."""

    what: str
    value: str
    origin: str


def shown_value(figure: Figure) -> str:
    """A threshold as a person reads it: degrees and percent instead of radians and ln ratios."""
    if figure.unit == "rad":
        return f"{math.degrees(figure.value):.2g} deg"
    if figure.unit == "rad/s":
        return f"{math.degrees(figure.value):.2g} deg/s"
    if figure.unit in ("ln ratio", "ratio"):
        return f"{figure.value * 100:.2g} %"
    return f"{figure.value:g} {figure.unit}".strip()


def thresholds(study: Study, slot: str) -> tuple[Threshold, ...]:
    """The thresholds of every cue this pilot has, those that told one of the observers first."""
    by = {n.cue for n in study.notices.get(slot, ()) if n.cue is not None}
    rows = []
    for name in dict.fromkeys(history.name for history in study.cues.get(slot, ())):
        if name not in TECHNIQUE:
            continue
        values = tuple((shown_value(TABLE[o].weber[name]), TABLE[o].weber[name].status) for o in OBSERVERS)
        technique = TECHNIQUE[name]
        ids = "; ".join(dict.fromkeys(TABLE[o].weber[name].ids for o in OBSERVERS))
        rows.append(Threshold(cue_words(name), name in by, values, (shown_value(technique), technique.status), ids))
    return tuple(sorted(rows, key=lambda row: not row.used))


def works(study: Study, slot: str) -> tuple[tuple[str, str], ...]:
    """The works behind the ids that the thresholds and reactions name, as (id, work), in the order of the ids."""
    text = " ".join([*(source(h.name) for h in study.cues.get(slot, ()) if h.name in TECHNIQUE), "3.15 1.49 1.50 1.46"])
    ids = {word.strip("(),;") for word in text.replace("-", " ").split()}
    return tuple((key, words) for key, words in WORKS.items() if key in ids)


def weakest(study: Study, slot: str) -> str:
    """The weakest status behind this slot's noticing times, in a sentence; "" where nobody noticed."""
    found = [TABLE[n.observer].weber[n.cue].status for n in study.notices.get(slot, ())
             if n.cue is not None and n.cue in TABLE[n.observer].weber]
    if not found:
        return ""
    worst = max(found, key=lambda status: RANK[status])
    return (f"The weakest figure behind these noticing times is {'a guess' if worst == 'guess' else worst}: "
            f"{STATUS_WORDS[worst]}. The scatter of technique is a guess in every cue until the team has its own.")


def power_words(power: Power) -> str:
    """A throttle in words."""
    return power.kind if power.kind != "part" else f"{power.part * 100:.0f} %"


def assumptions(study: Study, slot: str) -> tuple[Assumption, ...]:
    """What the scene and the models take for granted, in the order an instructor asks for it."""
    scene, units = study.scene, Units(study.scene.film.units)
    k = study.faulted.names.index(slot)
    craft, out, watch = study.faulted.airframes[k], scene.break_out, scene.watch
    rows = [
        Assumption("Aircraft of this seat", craft.title, craft.invented),
        Assumption("Floor", f"{units.length(scene.floor_m)} above the ground", "the scene: the team's own minimum"),
        Assumption("Break-out", f"{out.load_factor:g} g at {out.onset_gps:g} g/s, bank away "
                   f"{math.degrees(out.bank_away_rad):.0f} deg, power {power_words(out.power)}"
                   + (f", acting {out.delay_s:g} s late" if out.delay_s else ""), "the scene"),
        Assumption("Eyes", _eyes(watch.look_at, watch.gauges_every_s, watch.gauge_look_s), "the scene"),
        Assumption("Lead's call", "none" if watch.call_after_s is None else
                   f"{watch.call_after_s:g} s after he could feel it", "the scene"),
        Assumption("Reaction", ", ".join(f"{o} {TABLE[o].reaction.value:g} s" for o in OBSERVERS),
                   f"{TABLE['likely'].reaction.ids} ({TABLE['likely'].reaction.status})"),
        Assumption("Attention off the gaze",
                   ", ".join(f"{o} {TABLE[o].attention.value * 100:.0f} %" for o in OBSERVERS),
                   f"{TABLE['likely'].attention.ids} ({TABLE['likely'].attention.status})"),
        Assumption("Detector", "a difference above two sigma for 0.3 s", "a common form of threshold and dwell"),
        Assumption("Day", _day(study), "the scene; standard atmosphere"),
        Assumption("Station keeping", "the wings fly to hold their places, the lead against the fault to the stop of "
                   "his stick", "guess, checked on the shipped slots"),
        Assumption("Not modelled", "vision lost under g, glare, dirt on the canopy, surprise beyond the reaction "
                   "times, wake", "each would make it later, none earlier"),
    ]  # fmt: skip
    return tuple(rows)


def _eyes(look_at: str, every_s: float | None, look_s: float) -> str:
    where = "on the lead" if look_at == "lead" else "ahead"
    if every_s is None:
        return f"{where}, never inside"
    return f"{where}, inside every {every_s:g} s for {look_s:g} s"


def _day(study: Study) -> str:
    day, units = study.scene.day, Units(study.scene.film.units)
    words = [f"field at {units.length(day.field_elevation_m)}"]
    if day.temperature_k is not None:
        words.append(f"{day.temperature_k - 273.15:.0f} degC")
    if day.wind is not None:
        words.append(f"wind from {math.degrees(day.wind.from_rad):.0f} deg at {units.speed(day.wind.speed_mps)}")
    return ", ".join(words)
