"""Tables: CSV, JSON and text carry the same figures. Files are read back with the standard library's readers."""

from __future__ import annotations

import csv
import json

import numpy as np
import pytest

from viewer.errors import ExportError
from viewer.export.tables import csv_text, json_text, readable, rounded, text_table, write_table

ROWS = [
    {
        "design": "baseline",
        "mode": 1,
        "name": 'boom "nods", then rests',
        "frequency_hz": 82.60123456789012,
        "largest_real_m": 3.9e-6,
        "strain_percent": 61.04999,
        "closure": np.float64(1.0),
        "trusted": True,
        "never": None,
    },
    {
        "design": "baseline",
        "mode": 2,
        "name": "",
        "frequency_hz": 1142.0,
        "largest_real_m": None,
        "strain_percent": 0.04,
        "closure": float("nan"),
        "trusted": np.bool_(False),
        "never": None,
    },
]


def test_files_carry_every_digit(tmp_path):
    path = write_table(tmp_path / "deep" / "modes.csv", ROWS)
    with path.open(newline="", encoding="utf-8") as stream:
        back = list(csv.DictReader(stream))
    loaded = json.loads(write_table(tmp_path / "modes.json", ROWS).read_text("utf-8"))
    assert list(back[0]) == list(ROWS[0]) == list(loaded["rows"][0])
    for given, from_csv, from_json in zip(ROWS, back, loaded["rows"], strict=True):
        assert float(from_csv["frequency_hz"]) == from_json["frequency_hz"] == given["frequency_hz"]
        assert from_csv["name"] == from_json["name"] == given["name"]
        assert from_json["trusted"] is bool(given["trusted"])
    assert back[1]["largest_real_m"] == ""
    assert loaded["rows"][1]["largest_real_m"] is None
    assert loaded["rows"][1]["closure"] is None  # not a number: unknown, never NaN in JSON
    assert loaded["units"] == {"frequency_hz": "Hz", "largest_real_m": "m", "strain_percent": "%"}
    assert not list(tmp_path.glob("**/.part-*"))


def test_text_says_the_same_rounded():
    text = readable(ROWS)
    assert "82.60" in text
    assert "1142" in text
    assert "61.0" in text
    assert "3.900" in text
    assert "µm" in text
    assert "never" not in text
    assert "yes" in text
    assert "no" in text
    lines = text.splitlines()
    assert (
        len(
            {line.index("82.60") + 5 for line in lines if "82.60" in line}
            | {line.index("1142") + 4 for line in lines if "1142" in line}
        )
        == 1
    )  # flush right


def test_text_columns_match_the_full_figures():
    table = text_table(ROWS)
    column = table.titles.index("frequency")
    assert table.units[column] == "Hz"
    for row, cells in zip(ROWS, table.cells, strict=True):
        assert float(cells[column]) == pytest.approx(row["frequency_hz"], rel=5e-4)


def test_a_wide_table_is_broken_and_repeats_what_a_row_is_about():
    rows = [
        {"design": "a", "mode": m, **{f"a_rather_long_figure_{i}": 1.5 * i * m for i in range(1, 12)}} for m in (1, 2)
    ]
    text = readable(rows, width=80)
    assert all(len(line) <= 80 for line in text.splitlines())
    blocks = text.split("\n\n")
    assert len(blocks) > 1
    assert all(block.startswith("design  mode") for block in blocks)


def test_wide_letters_and_line_breaks_keep_the_columns():
    rows = [{"name": "梁がうなずく", "n_hz": 1.0}, {"name": "a\nb", "n_hz": 2.0}]
    lines = readable(rows).splitlines()
    assert lines[-2].index("1.000") + 6 == lines[-1].index("2.000")  # six letters of double width
    assert "a b" in lines[-1]


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.0, "0"),
        (9.9996, "10.00"),
        (82.6, "82.60"),
        (1204.4, "1204"),
        (123456.0, "123500"),
        (0.00123, "0.001230"),
        (3.9e-6, "3.900e-06"),
        (-12.3456, "-12.35"),
        (1e9, "1.000e+09"),
    ],
)
def test_rounding(value, text):
    assert rounded(value) == text
    assert float(text) == pytest.approx(value, rel=5.1e-4)


def test_empty_and_bad_input(tmp_path):
    assert csv_text([]) == ""
    assert json.loads(json_text([]))["rows"] == []
    assert readable([]) == "(nothing to list)"
    with pytest.raises(ExportError, match=r"csv or \.json"):
        write_table(tmp_path / "modes.xls", ROWS)
    with pytest.raises(TypeError):
        json_text([{"a": [1]}])
    assert not list(tmp_path.iterdir())


def test_a_small_share_is_not_printed_as_nothing():
    table = text_table([{"mode": m, "strain_percent": v} for m, v in enumerate((0.0, 0.03, -0.03, 0.06, 12.0), 1)])
    assert [cells[1] for cells in table.cells] == ["0.0", "<0.1", ">-0.1", "0.1", "12.0"]
