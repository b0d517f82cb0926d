"""The one reader of shipped tables: order, header lines, and errors that name file, row and next step."""

from __future__ import annotations

from pathlib import Path

import pytest

from pertcalc import shipped
from pertcalc.errors import DataFileError
from pertcalc.shipped import shipped_rows


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.setattr(shipped, "files", lambda package: tmp_path)
    (tmp_path / "data" / "some").mkdir(parents=True)
    return tmp_path / "data" / "some"


def test_rows_come_in_order_and_without_the_header(folder: Path) -> None:
    (folder / "t.csv").write_text("# made by a script\n# mark: READ\na,b\n1,x\n2,y\n", encoding="utf-8")
    assert shipped_rows("some", "t.csv", lambda row: (int(row["a"]), row["b"])) == ((1, "x"), (2, "y"))


def test_a_bad_row_is_named(folder: Path) -> None:
    (folder / "t.csv").write_text("a\n1\noops\n", encoding="utf-8")
    with pytest.raises(DataFileError, match=r"(?s)t\.csv.*row 2.*oops.*reinstall pertcalc"):
        shipped_rows("some", "t.csv", lambda row: int(row["a"]))


def test_a_missing_table_is_an_incomplete_installation(folder: Path) -> None:
    with pytest.raises(DataFileError, match=r"(?s)t\.csv.*reinstall pertcalc"):
        shipped_rows("some", "t.csv", dict)
