"""The rows of every table: one owner for which figures are shown, so that terminal, CSV, JSON and page agree."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from viewer.insight.given_energy import agreement
from viewer.model.arrays import Array
from viewer.model.cycle import cycle_peaks
from viewer.model.design import FunctionalPoint
from viewer.scene.figures import digits, hertz, length
from viewer.workspace import Study

Row = dict[str, Any]
_WHOLE = 0.95  # a group that holds more of the body than this says nothing about where


# What terminal and page show of the rows; files carry every column.
_SHORT = (
    "design", "mode", "name", "frequency_hz", "largest_motion_at", "largest_motion_direction", "largest_real_m",
    "magnification", "strain_energy_most_in", "strain_energy_most_percent", "energies_trusted", "energy_note",
    "given_energy_agreement",
    "point", "effect", "direction", "motion_percent_of_largest", "real_motion_m",
    "first_design", "first_mode", "first_name", "second_design", "second_mode", "first_hz", "second_hz",
    "change_percent", "became", "mac", "close_group_agreement", "hinge_change",
    "group", "strain_energy_percent", "kinetic_energy_percent", "volume_percent",
    "test", "test_mode", "analysis_mode", "analysis_name", "found", "test_hz", "analysis_hz", "damping_percent",
    "phase_collinearity", "phase_deviation_deg", "doubtful", "correction", "what", "mean_mac_before",
    "mean_mac_after", "as_likely", "placement", "fit_m", "channel", "used", "from_surface_m", "to_normal_deg",
    "enhanced_comac", "left_out_error_percent", "on_modes", "expected_error_percent",
    "with_one_more_percent", "x_m", "y_m", "z_m", "node",
    "worst_auto_mac",
    "verdict", "hinge", "place", "kind", "label", "confidence_percent", "fold_drawn_deg", "fold_real_deg",
    "stiffness_nmrad", "length_m",
)  # fmt: skip


def short(rows: Sequence[Row]) -> list[Row]:
    """The rows with the columns that are read at a glance."""
    return [{key: value for key, value in row.items() if key in _SHORT} for row in rows]


def mode_rows(study: Study) -> list[Row]:
    """One row a mode: frequency, energies and how far they are trusted, largest motion, size."""
    return [_mode_row(study, index) for index in range(study.count)]


def _mode_row(study: Study, index: int) -> Row:
    found, modes = study.energies, study.modes
    scale = study.scale(index)
    row: Row = {
        "design": study.design.name,
        "mode": index + 1,
        "name": study.name(index),
        "frequency_hz": float(modes.freq_hz[index]),
        "damping_ratio": None if modes.damping is None else float(modes.damping[index]),
        "origin": modes.origin,
        "largest_motion_at": scale.largest_place,
        "largest_motion_direction": scale.largest_word,
        "largest_real_m": scale.largest_real,
        "size_statistic": scale.statistic if scale.largest_real is not None else None,
        "magnification": scale.magnification,
        "drawn_peak_percent_of_diagonal": scale.drawn_percent,
        "drawn_limited_by": scale.limited_by,
        "strain_energy_most_in": None,
        "strain_energy_most_percent": None,
        "kinetic_energy_most_in": None,
        "kinetic_energy_most_percent": None,
        "springs_strain_percent": None,
        "masses_kinetic_percent": None,
        "closure": None,
        "residual_share": None,
        "energies_trusted": None,
        "energy_note": None,
        "given_energy_agreement": None,
    }
    if found is not None:
        for word, values in (("strain", found.strain[index]), ("kinetic", found.kinetic[index])):
            name, share = _most(study, values, found.volumes)
            row[f"{word}_energy_most_in"], row[f"{word}_energy_most_percent"] = name, share
        if not study.relative:  # springs and masses are left out of relative energies
            row["springs_strain_percent"] = 100 * found.spring_share(index)
            row["masses_kinetic_percent"] = 100 * found.mass_share(index)
        else:
            row["energy_note"] = found.note(index) or None
        if modes.cell_energy is not None:
            row["given_energy_agreement"] = _number(agreement(found.strain[index], modes.cell_energy[index]))
    if study.figures is not None:
        row["closure"] = _number(study.figures.closure[index])
        row["residual_share"] = _number(study.figures.residual[index])
        row["energies_trusted"] = bool(study.figures.trusted[index])
    return row


def mode_caption(row: Row) -> str:
    """One or two plain sentences made of a mode row's own figures."""
    where, way = row["largest_motion_at"], row["largest_motion_direction"]
    said = [f"{hertz(row['frequency_hz'])}, largest motion at {where}, {way}"]
    if row["largest_real_m"] is not None:
        said.append(f"really {length(row['largest_real_m'])} ({row['size_statistic']})")
    text = ", ".join(said) + "."
    if row["strain_energy_most_in"]:
        share = digits(row["strain_energy_most_percent"])
        text += f" {share} % of the strain energy sits in {row['strain_energy_most_in']}."
    if row["springs_strain_percent"]:
        text += f" Springs hold {digits(row['springs_strain_percent'])} % of it."
    if row["energies_trusted"] is False and row["closure"] is not None:
        text += f" Energies are not trusted (closure {row['closure']:.2f})."
    elif row["energies_trusted"] is None and row["energy_note"]:
        text += f" Energies are {row['energy_note']}."
    return text


def group_rows(study: Study) -> list[Row]:
    """One row for each mode and cell group: its shares of strain energy, kinetic energy and volume, in percent of
    what the cells hold (springs and lumped masses apart), and of the strain energy that the modes' file gives."""
    found = study.energies
    if found is None:
        return []
    given = study.modes.cell_energy
    rows: list[Row] = []
    for index in range(study.count):
        for name, cells in study.design.mesh.cell_groups.items():
            rows.append(
                {
                    "design": study.design.name,
                    "mode": index + 1,
                    "group": name,
                    "strain_energy_percent": _percent(found.strain[index], cells),
                    "kinetic_energy_percent": _percent(found.kinetic[index], cells),
                    "volume_percent": _percent(found.volumes, cells),
                }
            )
            if study.relative:
                rows[-1]["energy_note"] = found.note(index)
            if given is not None:
                rows[-1]["given_strain_energy_percent"] = _percent(np.nan_to_num(given[index]), cells)
    return rows


def point_rows(study: Study) -> list[Row]:
    """One row for each mode and functional point: its motion along the sensitive direction, against the mode's
    largest motion and in metres where the mode's size is known."""
    rows = []
    for index in range(study.count):
        shape = study.modes.shape(index)
        scale = study.scale(index)
        peak = float(cycle_peaks(shape[study.design.mesh.used_nodes]).max())
        for carried in study.carried:
            if not isinstance(carried.item, FunctionalPoint):
                continue
            along = float(abs(carried.motion(shape)[:3] @ carried.item.direction))
            real = scale.real_per_shape
            rows.append(
                {
                    "design": study.design.name,
                    "mode": index + 1,
                    "point": carried.name,
                    "effect": carried.item.effect,
                    "direction": carried.item.direction_word or _vector(carried.item.direction),
                    "motion_percent_of_largest": 100 * along / peak,
                    "real_motion_m": None if real is None else along * real,
                    "size_statistic": None if real is None else scale.statistic,
                }
            )
    return rows


def _most(study: Study, values: Array, volumes: Array) -> tuple[str | None, float | None]:
    """The group that holds most of ``values``, and its share in percent."""
    best, share = None, 0.0
    for name, cells in study.design.mesh.cell_groups.items():
        held = _percent(values, cells)
        if held is not None and held > share and volumes[cells].sum() < _WHOLE * volumes.sum():
            best, share = name, held
    return best, share if best else None


def _percent(values: Array, cells: Array) -> float | None:
    total = float(np.sum(values))
    return 100 * float(np.sum(values[cells])) / total if total > 0 else None


def _number(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None


def _vector(direction: Array) -> str:
    return "({})".format(", ".join(f"{c:.2g}" for c in direction))
