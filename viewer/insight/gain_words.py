"""Gain maps in words, from the figures of ``GainMap.to_dict`` alone."""

from __future__ import annotations

from math import floor, log10
from typing import Any

_WORTH = 0.1  # share of the energy from which on a spring or a lumped mass is spoken of
_CHANGED = {"sheet": "thickness", "beams": "area of section", "solid": "stiffness and mass"}


def sentence_of(facts: dict[str, Any]) -> str:
    """Where more and where less material raises the frequency, and by how much."""
    several = facts["modes_of_equal_frequency"]
    head = f"Mode {facts['mode']} ({facts['frequency_hz']:.4g} Hz)"
    if facts["rigid_body"]:
        return f"Mode {facts['mode']} is a rigid-body mode: neither stiffness nor mass changes its frequency."
    if not facts["absolute"]:
        return f"{head}: {_shares(facts)}; energies here give shares only, so no figure in hertz."
    if several:
        listed = f"{', '.join(str(n) for n in several[:-1])} and {several[-1]}"
        head = f"Modes {listed} (as good as equal, {facts['frequency_hz']:.4g} Hz)"
    what = "their mean" if several else "it"
    parts = [_place(facts, "stiffen", what, "more"), _place(facts, "lighten", what, "less")]
    parts += [_spring(facts), _mass(facts)]
    said = [part for part in parts if part] or ["no change of material at one place moves it noticeably"]
    return f"{head}: {'; '.join(said)}; first-order estimates, to be checked by solving the changed design."


def callout_words(verb: str, place: dict[str, Any]) -> str:
    """A few words at an extreme: "add material here: +14 Hz per kg"."""
    done = "added" if verb == "add" else "removed"
    return f"{verb} material here: +{plain(abs(place['hz_per_kg']))} Hz per kg {done}"


def plain(value: float, significant: int = 2) -> str:
    """A figure of few digits, never with a power of ten: 13.6 → "14", 0.0123 → "0.012", 1364 → "1400"."""
    if value == 0:
        return "0"
    rounded = float(f"{value:.{significant - 1}e}")
    return f"{rounded:.{max(significant - 1 - floor(log10(abs(rounded))), 0)}f}".replace("-", "−")


def mass_words(kilograms: float) -> str:
    return f"{plain(kilograms)} kg" if kilograms >= 1 else f"{plain(1e3 * kilograms)} g"


def _place(facts: dict[str, Any], listed: str, what: str, more: str) -> str:
    if not facts[listed]:
        return ""
    place, sign = facts[listed][0], 1 if more == "more" else -1
    change = _CHANGED.get(place["made_of"], "material")
    rise = place["hz_for_tenth_more" if more == "more" else "hz_for_tenth_less"]
    per_kg = f"{plain(sign * place['hz_per_kg'])} Hz per kg"
    if place["hz_per_kg_split"]:
        ends = sorted(sign * value for value in place["hz_per_kg_split"])
        per_kg += f", {plain(ends[0])} Hz per kg for one and {plain(ends[-1])} Hz per kg for another of them"
    place_words = f"{facts['change']:.0%} {more} {change} on {place['name']}, {mass_words(place['tenth_kg'])}"
    return f"{place_words}, raises {what} by about {plain(rise)} Hz ({per_kg})"


def _spring(facts: dict[str, Any]) -> str:
    springs = [spring for spring in facts["springs"] if spring["strain_share"] >= _WORTH]
    if not springs:
        return ""
    best = max(springs, key=lambda spring: spring["strain_share"])
    return f"{facts['change']:.0%} more stiffness of {best['name']} by about {plain(best['hz_for_tenth_more'])} Hz"


def _mass(facts: dict[str, Any]) -> str:
    masses = [mass for mass in facts["masses"] if mass["kinetic_share"] >= _WORTH]
    if not masses:
        return ""
    best = max(masses, key=lambda mass: mass["kinetic_share"])
    return (
        f"{facts['change']:.0%} less mass of {best['name']}, {mass_words(best['tenth_kg'])}, by about "
        f"{plain(best['hz_for_tenth_less'])} Hz"
    )


def _shares(facts: dict[str, Any]) -> str:
    parts = []
    for listed, kind, verb in (("stiffen", "strain", "more"), ("lighten", "kinetic", "less")):
        if facts[listed]:
            place = facts[listed][0]
            parts.append(
                f"{verb} material counts most on {place['name']}, which holds {place[f'{kind}_share']:.0%} of the "
                f"{kind} energy in {place['mass_share']:.1%} of the mass"
            )
    return ", ".join(parts) or "no place stands out"
