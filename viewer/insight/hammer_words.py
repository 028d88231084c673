"""Sentences about a test beside the model."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from viewer.model.written import GAP, digits


def numbers(modes: Sequence[int]) -> str:
    """ "mode 3", "modes 3, 4 and 6"; runs of four and more as "modes 3 to 9"."""
    if len(modes) == 1:
        return f"mode {modes[0]}"
    if len(modes) > 3 and modes[-1] - modes[0] == len(modes) - 1:
        return f"modes {modes[0]} to {modes[-1]}"
    return f"modes {', '.join(str(n) for n in modes[:-1])} and {modes[-1]}"


def sentence_of(facts: dict[str, Any]) -> str:
    """The plain sentence made of the figures of ``TestCorrelation.to_dict``."""
    test, design = facts["test"] or "the test", facts["design"] or "the model"
    paired, measured = facts["paired"], facts["measured_modes"]
    if not paired:
        return f"None of the {measured} measured modes of {test} looks like a mode of {design}."
    if paired == measured:
        words = f"{'All' if paired > 1 else 'The'} {paired} measured mode{'s' if paired > 1 else ''} of {test}"
    else:
        words = f"Of the {measured} measured modes of {test}, {paired}"
    words += f" {'is' if paired == 1 else 'are'} found in {design}"
    words += f" with an agreement of {facts['least_agreement']:.0%}" + (" or better" if paired > 1 else "")
    if facts["largest_change_percent"] is not None:
        words += f", {_frequencies(facts, paired)}"
    if lost := facts["measured_without_counterpart"]:
        words += f"; measured {numbers(lost)} {_has(lost)} no counterpart"
    if lost := facts["computed_without_counterpart"]:
        words += f"; {numbers(lost)} of {design} {'was' if len(lost) == 1 else 'were'} not found in the test"
    if alike := facts["looking_alike"]:
        listed = "; ".join(numbers(group) for group in alike)
        words += f"; at these points {listed} of {design} look alike, so that the choice between them is open"
    elif open_ := facts["doubtful"]:
        words += f"; for measured {numbers(open_)} another mode of {design} agrees nearly as well"
    if facts["worst_channel_stands_out"]:
        words += f"; they differ most at {facts['worst_channel']}"
    if facts["reduction_is_fair"] is False:
        words += (
            f"; products through the reduced mass mean little, since the points mix modes of {design} there by up to "
            f"{facts['reduction_error']:.0%}"
        )
    return words + "."


def _frequencies(facts: dict[str, Any], paired: int) -> str:
    largest = facts["largest_change_percent"]
    if abs(largest) < 0.05:
        return "at the measured frequency" if paired == 1 else "at the measured frequencies"
    sign = "above" if largest > 0 else "below"
    if paired == 1:
        return f"{digits(abs(largest))}{GAP}% {sign} the measured frequency"
    off = f"frequencies at most {digits(abs(largest))}{GAP}% off"
    return f"{off} (the largest difference lies {sign} the measured one)"


def _has(modes: Sequence[int]) -> str:
    return "has" if len(modes) == 1 else "have"
