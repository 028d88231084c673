"""Tables of findings, made of the figures of ``to_dict()`` of each: the same numbers as in its sentence."""

from __future__ import annotations

from typing import Any

from viewer.export.rows import Row


def hinge_rows(design: str, finding: dict[str, Any]) -> list[Row]:
    """One row a hinge of one mode; a mode that does not fold has one that says so."""
    about: Row = {
        "design": design,
        "mode": finding["mode"],
        "frequency_hz": finding["frequency_hz"],
        "verdict": finding["verdict"],
    }
    return [{**about, **_hinge(hinge)} for hinge in finding["hinges"]] or [{**about, **dict.fromkeys(_HINGE)}]


def flap_rows(design: str, finding: dict[str, Any]) -> list[Row]:
    """One row a flap of one mode."""
    return [
        {
            "design": design,
            "mode": finding["mode"],
            "flap": flap["number"],
            "place": flap["place"],
            "hangs_on_hinge": " and ".join(str(number) for number in flap["hinges"]),
            "kinetic_energy_percent": 100 * flap["kinetic_share"],
            "strain_energy_percent": 100 * flap["strain_share"],
            "rigid_fit_percent": 100 * flap["rigid_fit"],
            "size_m": flap["size_m"],
        }
        for flap in finding["flaps"]
    ]


def outcome_rows(comparison: dict[str, Any]) -> list[Row]:
    """One row for each mode of the first design, and for each that is new, of ``Comparison.to_dict``."""
    return [
        {
            "first_design": facts["first_design"],
            "first_mode": facts["first_mode"],
            "first_name": facts["first_name"],
            "second_design": facts["second_design"],
            "second_mode": facts["second_mode"],
            "second_name": facts["second_name"],
            "became": facts["kind"],
            "first_hz": facts["first_hz"],
            "second_hz": facts["second_hz"],
            "change_percent": facts["change_percent"],
            "mac": facts["mac"],
            "close_group_agreement": facts["subspace_agreement"],
            "hinge_change": "; ".join(_hinge_change(change) for change in facts["hinges"] or ()),
            "paired_by": facts["paired_by"],
        }
        for facts in comparison["outcomes"]
    ]


def _hinge_change(facts: dict[str, Any]) -> str:
    at = f" at {facts['place']}" if facts["place"] else ""
    if facts["second_hinge"] is None:
        return f"hinge {facts['first_hinge']}{at} gone"
    if facts["first_hinge"] is None:
        return f"new hinge{at}"
    if facts["share_change"] is None:
        return f"hinge {facts['first_hinge']}{at} stays"
    return f"hinge {facts['first_hinge']}{at} {facts['share_change']:+.0%} of its share".replace("-", "−")


def _hinge(facts: dict[str, Any]) -> Row:
    percent = lambda share: None if share is None else 100 * share  # noqa: E731
    x, y, z = facts["position_m"]
    along = facts["direction"]
    row = {
        "hinge": facts["number"],
        "place": facts["place"],
        "kind": facts["kind"],
        "label": facts["label"],
        "confidence_percent": 100 * facts["confidence"],
        "strain_energy_percent": percent(facts["strain_share"]),
        "volume_percent": 100 * facts["volume_share"],
        "fold_drawn_deg": facts["fold_drawn_deg"],
        "fold_real_deg": facts["fold_real_deg"],
        "stiffness_nmrad": facts["rotational_stiffness_nm_per_rad"],
        "length_m": facts["length_m"],
        "width_m": facts["width_m"],
        "at_x_m": x,
        "at_y_m": y,
        "at_z_m": z,
        "along": "({})".format(", ".join(f"{c:.2f}".replace("-", "−") for c in along)),
        "contrast": facts["contrast"],
        "turn_percent": 100 * facts["turn_share"],
        "weakest_gate": facts["weakest_gate"],
        "score": facts["score"],
    }
    assert tuple(row) == _HINGE
    return row


_HINGE = (
    "hinge", "place", "kind", "label", "confidence_percent", "strain_energy_percent", "volume_percent",
    "fold_drawn_deg", "fold_real_deg", "stiffness_nmrad", "length_m", "width_m", "at_x_m", "at_y_m", "at_z_m",
    "along", "contrast", "turn_percent", "weakest_gate", "score",
)  # fmt: skip
