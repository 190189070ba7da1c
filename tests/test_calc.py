"""The workbook in the steward's own program: LibreOffice Calc, without a window."""

from __future__ import annotations

import json
import os
import shutil
import subprocess
from collections.abc import Callable
from pathlib import Path

import pytest

from generator import spreadsheet, workbook

ROOT = Path(__file__).resolve().parents[1]
IN_CI = os.environ.get("CI", "").lower() in {"1", "true"}
SYSTEM_PYTHON = "/usr/bin/python3"
pytestmark = pytest.mark.build


def _missing(what: str) -> None:
    message = f"{what} not found: install libreoffice-calc and python3-uno (see README.md)"
    pytest.fail(message) if IN_CI else pytest.skip(message)


Convert = Callable[[Path, str], Path]


@pytest.fixture(scope="module")
def convert(tmp_path_factory: pytest.TempPathFactory) -> Convert:
    """Open a workbook in Calc and save it as ``xlsx`` or ``ods``."""
    office = shutil.which("soffice")
    if office is None:
        _missing("LibreOffice")
    profile = tmp_path_factory.mktemp("profile")
    count = iter(range(100))

    def converted(path: Path, kind: str) -> Path:
        folder = tmp_path_factory.mktemp(f"saved-{next(count)}")
        subprocess.run(
            [
                str(office), f"-env:UserInstallation={profile.as_uri()}", "--headless",
                "--convert-to", kind, "--outdir", str(folder), str(path),
            ],
            check=True, capture_output=True, timeout=180,
        )  # fmt: skip
        return folder / f"{path.stem}.{kind}"

    return converted


@pytest.mark.parametrize("way", [("xlsx", "ods", "xlsx"), ("ods", "xlsx", "ods")], ids="-".join)
def test_the_shipped_tables_pass_through_calc_without_a_difference(
    way: tuple[str, ...], convert: Convert, tmp_path: Path
) -> None:
    path = tmp_path / f"tables.{way[0]}"
    workbook.write(ROOT / "data", path)
    written = spreadsheet.read(path)
    for kind in way[1:]:
        path = convert(path, kind)
        plan = workbook.read(ROOT / "data", path)
        assert (plan.changes, plan.files) == ((), {}), path
        came = spreadsheet.read(path)
        place = came["solvents"][0].index("cas")
        assert [r[place] for r in came["solvents"]] == [r[place] for r in written["solvents"]]


TYPED = [
    ("measurements", "C2", "value", "80.10"),
    ("measurements", "C3", "value", "0.9980"),
    ("measurements", "F5", "temperature_c", "20.0"),
    ("measurements", "I6", "note", "=1+1"),
    ("solvents", "C2", "cas", "75-05-8"),
    ("solvents", "F3", "note", "00123"),
    ("stock", "G2", "opened", "2026-03-01"),
]


@pytest.mark.parametrize(
    ("kind", "save_as"), [("xlsx", "Calc MS Excel 2007 XML"), ("ods", "calc8")]
)
def test_what_is_typed_in_calc_comes_back_as_typed(kind: str, save_as: str, tmp_path: Path) -> None:
    if shutil.which("soffice") is None:
        _missing("LibreOffice")
    knows = subprocess.run([SYSTEM_PYTHON, "-c", "import uno"], capture_output=True, check=False)
    if knows.returncode:
        _missing("LibreOffice's Python module")
    path, saved = tmp_path / f"tables.{kind}", tmp_path / f"saved.{kind}"
    workbook.write(ROOT / "data", path)
    cells = json.dumps([(sheet, address, text) for sheet, address, _, text in TYPED])
    subprocess.run(
        [SYSTEM_PYTHON, str(ROOT / "tests" / "calc_typing.py"), path, saved, save_as, cells],
        check=True, capture_output=True, timeout=240,
    )  # fmt: skip
    changes = workbook.read(ROOT / "data", saved).changes
    assert sorted((c.table, c.column, c.new) for c in changes) == sorted(
        (sheet, column, text) for sheet, _, column, text in TYPED
    )
