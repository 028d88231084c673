"""The rows of a test's tables: pairs, channels, points, corrections proposed, extra points."""

from __future__ import annotations

from typing import Any

import numpy as np

from viewer.export.rows import Row
from viewer.insight.sensor_choice import SensorChoice
from viewer.insight.wrong_channels import Faults
from viewer.workspace.testing import TestExplanation, TestStudy


def test_pair_rows(correlation: dict[str, Any]) -> list[Row]:
    """One row for each measured mode, and for each computed one that the test should have found, of
    ``TestCorrelation.to_dict``."""
    percent = lambda share: None if share is None else 100 * share  # noqa: E731
    return [
        {
            "test": correlation["test"],
            "test_mode": facts["test_mode"],
            "design": correlation["design"],
            "analysis_mode": facts["analysis_mode"],
            "analysis_name": facts["name"],
            "found": facts["kind"],
            "test_hz": facts["test_hz"],
            "analysis_hz": facts["analysis_hz"],
            "change_percent": facts["change_percent"],
            "damping_percent": percent(facts["damping_ratio"]),
            "mac": facts["mac"],
            "close_group_agreement": facts["subspace_agreement"],
            "cross_orthogonality": facts["cross_orthogonality"],
            "phase_collinearity": facts["phase_collinearity"],
            "phase_deviation_deg": facts["phase_deviation_deg"],
            "next_best_mode": facts["next_best_mode"],
            "next_best_mac": facts["next_best_mac"],
            "doubtful": facts["doubtful"],
            "looks_like": ", ".join(str(n) for n in facts["looks_like"]),
        }
        for facts in correlation["pairs"]
        if facts["test_mode"] is not None or facts["kind"] != "beyond"
    ]


def channel_rows(study: TestStudy, told: TestExplanation) -> list[Row]:
    """One row a channel: where it lies on the mesh, how it agrees, what the others say of it."""
    placed, test = told.registration, study.test
    none = np.full(test.n_channels, np.nan)
    comac, ecomac = (none, none) if told.correlation is None else (told.correlation.comac, told.correlation.ecomac)
    left_out = none if told.expansion is None else 100 * told.expansion.residual_by_channel
    points, directions = placed.points, placed.directions
    rows = []
    for c in range(test.n_channels):
        point = int(test.sensor[c])
        x, y, z = points[point].tolist()
        dx, dy, dz = directions[c].tolist()
        rows.append(
            {
                "test": study.name,
                "channel": test.channel_words(c),
                "used": bool(placed.used[c]),
                "at_x_m": x,
                "at_y_m": y,
                "at_z_m": z,
                "along_x": dx,
                "along_y": dy,
                "along_z": dz,
                "from_surface_m": float(placed.distances[point]),
                "to_normal_deg": _number(placed.normal_angles_deg[c]),
                "comac": _number(comac[c]),
                "enhanced_comac": _number(ecomac[c]),
                "left_out_error_percent": _number(left_out[c]),
            }
        )
    return rows


def proposal_rows(test: str, faults: dict[str, Any]) -> list[Row]:
    """One row for each correction proposed, of ``Faults.to_dict``."""
    return [
        {
            "test": test,
            "correction": p["number"],
            "what": p["words"],
            "mean_mac_before": p["mean_mac_before"],
            "mean_mac_after": p["mean_mac_after"],
            "as_likely": " or ".join(a["words"] for a in p["alternatives"]),
        }
        for p in faults["proposals"]
    ]


def expansion_rows(expansion: dict[str, Any]) -> list[Row]:
    """One row a measured mode, of ``Expansion.to_dict``: the analysis modes it is spread on, and how well
    the other channels foretell each one."""
    return [
        {
            "test": expansion["test"],
            "test_mode": facts["mode"],
            "frequency_hz": facts["frequency_hz"],
            "on_modes": ", ".join(str(n) for n in facts["basis"]),
            "left_out_error_percent": 100 * facts["left_out_error"],
            "expected_error_percent": _step(facts["choice"], taken=True),
            "with_one_more_percent": _step(facts["choice"], taken=False),
        }
        for facts in expansion["modes"]
    ]


def _step(choice: list[dict[str, Any]], *, taken: bool) -> float | None:
    """Error expected on the mesh, percent, with the modes taken or with the next one: why the basis ends there."""
    errors = [100 * step["error"] for step in choice if step["taken"] == taken]
    return errors[-1] if errors else None


def placement_rows(registration: dict[str, Any]) -> list[Row]:
    """One row for each placement that fits, when there are several."""
    if not registration["alternatives"]:
        return []
    first = {"placement": 1, "what": "the first one found", "fit_m": registration["rms_m"]}
    return [
        first,
        *(
            {"placement": n, "what": a["words"], "fit_m": a["rms_m"]}
            for n, a in enumerate(registration["alternatives"], start=2)
        ),
    ]


def extra_point_rows(study: TestStudy, choice: SensorChoice) -> list[Row]:
    """One row for each point that would help to tell the modes apart: places in the mesh's axes, and in the test's
    own, where somebody will look for them with a tape."""
    placed, rows = study.registration.placement, []
    for found in choice.rows:
        row: Row = {"test": study.name, **found}
        place = np.array([row.pop(axis) for axis in "xyz"])
        own = (place - placed.shift) @ placed.rotation / placed.scale
        row |= {f"{axis}_m": float(v) for axis, v in zip("xyz", place, strict=True)}
        row |= {f"test_{axis}_m": float(v) for axis, v in zip("xyz", own, strict=True)}
        rows.append(row)
    return rows


def accept_words(study: TestStudy, faults: Faults) -> str:
    """The command that accepts the proposals that have one cause, or any."""
    certain = [str(p.number) for p in faults.proposals if p.certain]
    numbers = ",".join(certain or [str(faults.proposals[0].number)])
    return f"hingelight pair DOSSIER {study.name} --accept {numbers} writes them into the dossier"


def choose_words(study: TestStudy) -> str:
    """What settles a placement that is not."""
    placed = study.registration
    if placed.unit_slip is not None:
        unit = placed.unit_slip.unit(study.plan.length_unit or 1.0)
        say = f'write length_unit = "{unit}" into the test' if unit else "state the test's length_unit"
        return f"If the points are in {placed.unit_slip.words}, {say}."
    how = f"hingelight pair DOSSIER {study.name} --place NUMBER writes one of them into the dossier"
    return f"Choose: {how}; or name landmarks, three points or more with their places."


def _number(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None
