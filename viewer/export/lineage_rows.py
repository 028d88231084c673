"""The rows of the tables of a lineage, of ``LineageFinding.to_dict``."""

from __future__ import annotations

from typing import Any

from viewer.export.rows import Row


def lineage_rows(facts: dict[str, Any]) -> list[Row]:
    """For files: one row a lineage and step. ``value`` in the unit that the parameter is told in."""
    si = facts["si_per_unit"]
    return [
        {
            "lineage": line["number"],
            "name": line["called"],
            "step": facts["labels"][s],
            "parameter": facts["parameter"],
            "value": facts["values"][s] / si if si else None,
            "unit": facts["unit"],
            "mode": line["modes"][s],
            "frequency_hz": line["frequency_hz"][s],
        }
        for line in facts["lineages"]
        for s in range(len(facts["values"]))
    ]


def step_rows(facts: dict[str, Any]) -> list[Row]:
    """For reading: one row a step, one column a lineage."""
    unit = f" ({facts['unit']})" if facts["unit"] else ""
    return [
        {
            "step": f"{facts['labels'][s]}{unit}",
            **{f"{line['called']}_hz": line["frequency_hz"][s] for line in facts["lineages"]},
        }
        for s in range(len(facts["values"]))
    ]


def encounter_rows(facts: dict[str, Any]) -> list[Row]:
    """One row an encounter."""
    called = {line["number"]: line["called"] for line in facts["lineages"]}
    si = facts["si_per_unit"]
    rows = []
    for e in facts["encounters"]:
        ends = [facts["labels"][facts["values"].index(value)] for value in e["between"]]
        rows.append(
            {
                "lineage": called[e["first"]],
                "other": called[e["second"]],
                "how": e["kind"],
                "from": ends[0],
                "to": ends[1],
                "at": e["at"] / si if si else None,
                "unit": facts["unit"],
                "least_gap_hz": e["gap_hz"],
                "turned_deg": e["turned_deg"],
                "proposed_step": e["proposed_step"] / si if e["proposed_step"] and si else None,
            }
        )
    return rows
