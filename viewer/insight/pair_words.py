"""The sentence about one measured mode and its counterpart."""

from __future__ import annotations

from typing import Any

from viewer.model.written import GAP, digits, hertz


def pair_sentence(facts: dict[str, Any]) -> str:
    """Made of the figures of ``TestPair.to_dict``; of a mode without counterpart too."""
    if facts["kind"] != "paired":
        return _alone(facts)
    words = f"Measured mode {facts['test_mode']} ({hertz(facts['test_hz'])}) is mode {facts['analysis_mode']}"
    words += f" of the model ({hertz(facts['analysis_hz'])})"
    change = facts["change_percent"]
    if change is not None:
        words += f", whose frequency is {digits(abs(change))}{GAP}% too {'high' if change > 0 else 'low'}"
    words += f"; their shapes agree to {facts['mac']:.0%}"
    if facts["subspace_agreement"] is not None:
        words += f", to {facts['subspace_agreement']:.0%} with close modes taken together"
    if facts["damping_ratio"] is not None:
        words += f"; measured damping {digits(100 * facts['damping_ratio'])}{GAP}%"
    if facts["doubtful"] and facts["next_best_mode"] is not None:
        words += (
            f"; mode {facts['next_best_mode']} agrees to {facts['next_best_mac']:.0%}, so that the choice is open"
        )
    return words + "."


def _alone(facts: dict[str, Any]) -> str:
    measured = facts["test_mode"] is not None
    who = f"Measured mode {facts['test_mode']}" if measured else f"Mode {facts['analysis_mode']} of the model"
    words = f"{who} ({hertz(facts['test_hz'] if measured else facts['analysis_hz'])}) has no counterpart"
    words += " in the model" if measured else " in the test"
    if facts["kind"] == "beyond":
        words += ", which may lie beyond the modes compared"
    return f"{words}; the nearest shape agrees to {facts['mac']:.0%}."
