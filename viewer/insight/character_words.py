"""A mode's character in words, made of the figures of ``Character.to_dict`` and of nothing else.

Both the sentence and the suggested name come from one reading of the figures: what moves, what it does, and the
figure that says so. The bounds below decide which words are chosen, never which figures are shown.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

Facts = Mapping[str, Any]
WHOLE = "the whole part"

_RIGID = 0.9995  # rigid content from which nothing bends to speak of
MOST = 0.5  # a share that decides
_SECOND = 0.35  # of the leading share, from which the second is named too
MOVES = 0.3  # motion of facing surfaces ÷ largest, from which they are what the mode is about
_LOCAL_ENERGY, _LOCAL_MASS = 0.5, 0.25  # a part that holds so much kinetic energy with so little mass is on its own
_SHOWN = 0.1  # a share of the sections' motion that is told
_HEAVY = 0.25  # kinetic share of a lumped mass that is said
_HARDLY = 0.02  # of the largest motion
_DRIVEN = 0.1  # effective mass share that is said
_STRAIGHT = 0.8
_KINDS = {
    "bending_share": "bending",
    "twisting_share": "twisting",
    "stretching_share": "along its length",
    "warping_share": "a change of its sections' shape",
}
_AXES = {"x": "along x", "y": "along y", "z": "up and down"}  # z is up


@dataclass(frozen=True)
class _Reading:
    """who does what, and the figure that says so; ``name`` is the same in short."""

    clause: str
    name: str
    reason: str
    tells_direction: bool = False


def sentence_of(facts: Facts) -> str:
    """One plain sentence."""
    reading = _read(facts)
    head = f"Mode {facts['mode']}"
    if facts["name"]:
        head += f" ({facts['name']})"
    elif reading is not None:
        head += f" (suggested name: {reading.name})"
    if reading is None and not facts["points"]:
        return f"{head}: what it does cannot be said in figures: {'; '.join(facts['cautions']) or 'nothing moves'}."
    parts = [reading.clause] if reading is not None else []
    along = "" if reading is None or reading.tells_direction else _direction(facts)
    parts += [words for words in (along, _together(facts), *_lumped(facts), _driven(facts)) if words]
    parts += [_point(point) for point in facts["points"]]
    if facts["assumed"]:
        parts.append(f"shares assume {facts['assumed']}")
    return f"{head}: {'; '.join(parts)}."


def suggestion(facts: Facts) -> tuple[str | None, str | None]:
    """A name and its reason, None when the figures suggest none."""
    reading = _read(facts)
    return (None, None) if reading is None else (reading.name, reading.reason)


def _read(facts: Facts) -> _Reading | None:
    for look in (_rigid_motion, _own_part, _arms, _walls, _long, _sheet, _mainly):
        found = look(facts)
        if found is not None:
            return found
    return None


def _rigid_motion(facts: Facts) -> _Reading | None:
    share, motions = facts["rigid_share"], facts["rigid_by_motion"]
    if share is None or share < _RIGID:
        return None
    key = max(motions, key=lambda name: motions[name])
    words = f"turns {key.replace('_', ' ')}" if key.startswith("about") else f"moves {_AXES[key]}"
    figure = f"{share:.1%} of its motion is rigid"
    return _Reading(f"{WHOLE} moves as one piece and mostly {words} ({figure})", f"whole part {words}", figure)


def _own_part(facts: Facts) -> _Reading | None:
    fitting = [g for g in facts["groups"] if g["kinetic_share"] >= _LOCAL_ENERGY and g["mass_share"] <= _LOCAL_MASS]
    apart = [g for g in fitting if g["kinetic_share"] >= 4 * g["mass_share"]]
    if not apart:
        return None
    group = min(apart, key=lambda g: g["mass_share"])
    name = _plain(group["name"])
    figure = f"{group['kinetic_share']:.0%} of the kinetic energy in {group['mass_share']:.1%} of the mass"
    return _Reading(f"the {name} moves on its own ({figure})", f"{name} moves on its own", figure)


def _arms(facts: Facts) -> _Reading | None:
    """Two arms with empty space between them."""
    for pair in facts["facing"]:
        if not pair["arms"] or pair["motion_to_largest"] < MOVES:
            continue
        who = _both(pair)
        if pair["opens_share"] >= MOST:
            figure = f"{pair['opens_share']:.0%} of their motion opens and closes the gap{_between(pair)}"
            what = (
                "spread apart and close"
                if pair["one_way"] >= _STRAIGHT
                else "spread in one place and close in another"
            )
            return _Reading(f"{who} {what} ({figure})", f"{_short(pair)} spread", figure)
        if pair["slides_share"] >= MOST:
            way = _way(pair["slide_direction"])
            figure = f"{pair['slides_share']:.0%} of their motion slides one past the other"
            sections = facts["long_axis"]
            still = _still(sections) if sections is not None and sections["twisting_share"] >= MOST else ""
            figure += f", standing still {still.replace('its', 'the')}" if still else ""
            return _Reading(
                f"{who} move opposite ways, {way} ({figure})", f"{_short(pair)} move in turn, {way}", figure
            )
    return None


def _walls(facts: Facts) -> _Reading | None:
    """Facing walls that bulge."""
    for pair in facts["facing"]:
        if pair["arms"] or pair["motion_to_largest"] < MOVES or pair["opens_share"] < MOST:
            continue
        who = _both(pair)
        figure = f"{pair['opens_share']:.0%} of their motion opens and closes the space{_between(pair)}"
        what = (
            "bulge apart and together"
            if pair["one_way"] >= _STRAIGHT
            else "bulge apart in one place, together in another"
        )
        return _Reading(f"{who} {what} ({figure})", f"{_short(pair)} bulge", figure)
    return None


def _long(facts: Facts) -> _Reading | None:
    """Bending, twisting or stretching of a long body."""
    sections = facts["long_axis"]
    if sections is None:
        return None
    verbs = {
        "bending_share": _bends(sections),
        "twisting_share": "twists",
        "stretching_share": "stretches",
        "warping_share": "changes the shape of its sections",
    }
    shares = sorted(((sections[key], key) for key in verbs), reverse=True)
    (first, key), (second, other) = shares[0], shares[1]
    named = [verbs[key]]
    if second >= _SECOND * first and other != "warping_share":
        named.append(verbs[other])
    short = [word.partition(",")[0] for word in named]
    clause = named[0] if len(named) == 1 else " and ".join(short)
    if len(named) == 2 and "," in named[0]:
        clause += f", {named[0].partition(', ')[2]}"
    figure = f"{first:.0%} of its motion is {_KINDS[key]}"
    figure += "".join(f", {value:.0%} {_KINDS[name]}" for value, name in shares[1:] if value >= _SHOWN)
    still = _still(sections)
    figure += f", standing still {still}" if still else ""
    name = f"whole part {' and '.join(short)}"
    if still:
        name += f", {sections['still_sections']} still section{'s' if sections['still_sections'] > 1 else ''}"
    return _Reading(f"{WHOLE} {clause} ({figure})", name, figure)


def _still(sections: Facts) -> str:
    places = [f"{place:.0%}" for place in sections["still_at"]]
    return f"at {' and '.join(places)} of its length" if places else ""


def _sheet(facts: Facts) -> _Reading | None:
    share = facts["out_of_plane_share"]
    if share is None or not (share >= MOST or facts["flat_sheet"]):
        return None
    figure = f"{share:.0%} of the motion is square to the sheet"
    if not facts["flat_sheet"]:
        return _Reading(f"its sheets bend ({figure})", "sheets bend", figure)
    if share >= MOST:
        fields = facts["fields"]
        how = f", in {fields} fields that lift in turn" if fields > 1 else ""
        name = f"sheet bends in {fields} fields" if fields > 1 else "sheet bends"
        return _Reading(f"the sheet bends out of its plane{how} ({figure})", name, figure)
    return _Reading(f"the sheet moves in its own plane ({figure})", "sheet moves in its plane", figure)


def _mainly(facts: Facts) -> _Reading | None:
    shares = facts["kinetic_share"]
    if shares is None:
        return None
    if shares["turning"] >= MOST:
        figure = f"{shares['turning']:.0%} of the kinetic energy is turning on the spot"
        return _Reading(f"{WHOLE} turns more than it moves ({figure})", "whole part turns on the spot", figure, True)
    first, second = sorted("xyz", key=lambda name: -shares[name])[:2]
    figure = f"{shares[first]:.0%} of the kinetic energy {_AXES[first]}"
    if shares[first] >= MOST:
        words, name = f"mostly {_AXES[first]}", _AXES[first]
    else:
        words = name = "in several directions"
        figure += f", {shares[second]:.0%} {_AXES[second]}"
    return _Reading(f"{WHOLE} moves {words} ({figure})", f"whole part moves {name}", figure, tells_direction=True)


def _direction(facts: Facts) -> str:
    shares = facts["kinetic_share"]
    if shares is None:
        return ""
    axis = max("xyz", key=lambda name: shares[name])
    verb = "goes" if axis == "z" else "moves"
    return f"{shares[axis]:.0%} of the kinetic energy {verb} {_AXES[axis]}"


def _together(facts: Facts) -> str:
    """Said of arms, which might have moved otherwise; walls joined to one another mostly move together."""
    for pair in facts["facing"]:
        if pair["arms"] and pair["together_share"] >= _STRAIGHT and pair["motion_to_largest"] >= MOVES:
            return f"{_both(pair)} move together ({pair['together_share']:.0%} of their motion)"
    return ""


def _lumped(facts: Facts) -> list[str]:
    held = facts["lumped_kinetic_share"]
    return [
        f"the {_plain(name)} carries {share:.0%} of the kinetic energy"
        for name, share in held.items()
        if share >= _HEAVY
    ]


def _driven(facts: Facts) -> str:
    """What a shaking support would excite."""
    if not facts["held"] or facts["effective_share"] is None:
        return ""
    along = {axis: facts["effective_share"][axis] for axis in "xyz"}
    axis = max(along, key=lambda name: along[name])
    if along[axis] < _DRIVEN:
        return ""
    return f"shaking the support {_AXES[axis]} drives {along[axis]:.0%} of the mass in this mode"


def _point(facts: Facts) -> str:
    way = facts["direction_word"] or _way(facts["direction"])
    ratio, real = facts["ratio_to_largest"], facts["along_real_m"]
    if ratio < _HARDLY:
        return f"the {facts['point']} hardly moves {way}, {ratio:.3f} of the largest motion"
    words = f"the {facts['point']} moves {way}, {ratio:.2g} of the largest motion"
    return words if real is None else f"{words}, {_length(real)} real"


def _bends(sections: Facts) -> str:
    """Nods (up and down), sways (level), or bends with its direction when the axis does not lie level."""
    axis, across = np.asarray(sections["axis"]), np.asarray(sections["across"])
    if sections["across_straight"] < _STRAIGHT:
        return "bends"
    if abs(axis[2]) < 0.3 and abs(across[2]) >= np.cos(np.radians(25)):
        return "nods, up and down"
    if abs(across[2]) <= np.sin(np.radians(25)):
        return f"sways, {_way(across)}"
    return f"bends, {_way(across)}"


def _between(pair: Facts) -> str:
    return f", {_length(pair['gap_m'])} wide" if pair["gap_m"] > 0 else ""


def _both(pair: Facts) -> str:
    first, second = pair["surfaces"]
    if first and second and first != second:
        return f"{_plain(first)} and {_plain(second)}"
    if first and first == second:
        return f"the facing sides of the {_plain(first)}"
    return "two facing arms" if pair["arms"] else "two facing surfaces"


def _short(pair: Facts) -> str:
    return _both(pair).removeprefix("the ").removeprefix("two ")


def _way(direction: Any) -> str:
    """Both ways along a direction; z is up."""
    unit = np.asarray(direction, float)
    unit = unit / np.linalg.norm(unit)
    axis = int(np.argmax(np.abs(unit)))
    if abs(unit[axis]) >= np.cos(np.radians(25)):
        return _AXES["xyz"[axis]]
    return "along ({})".format(", ".join(f"{c:.1f}".replace("-", "−") for c in unit))


def _length(metres: float) -> str:
    for unit, factor in (("m", 1.0), ("mm", 1e3), ("µm", 1e6)):
        if metres * factor >= (0.1 if unit == "mm" else 1.0):
            return f"{metres * factor:.3g} {unit}"
    return f"{metres * 1e9:.3g} nm"


def _plain(name: str) -> str:
    return name.replace("_", " ")
