"""The table of a strut trial, made of the figures of its ``to_dict()``."""

from __future__ import annotations

from typing import Any

from viewer.export.rows import Row


def strut_rows(design: str, finding: dict[str, Any]) -> list[Row]:
    """One row a strut: where it stands, what it is predicted to do, what a new solution says."""
    return [{"design": design, "mode": finding["mode"], **_strut(each)} for each in finding["struts"]]


def _strut(facts: dict[str, Any]) -> Row:
    predicted, resolved = facts["predicted"], facts["resolved"]
    return {
        "strut": facts["rank"],
        "from": facts["from"]["words"],
        "to": facts["to"]["words"],
        "length_m": facts["length_m"],
        "stiffness_nperm": facts["stiffness_n_per_m"],
        "predicted_hz": predicted["frequency_hz"],
        "predicted_share_percent": 100 * predicted["share"],
        "resolved_hz": resolved and resolved["frequency_hz"],
        "resolved_share_percent": resolved and 100 * resolved["share"],
        "becomes_mode": (resolved or predicted)["mode"],
        "rigid_strut_hz": facts["rigid"]["frequency_hz"],
    }
