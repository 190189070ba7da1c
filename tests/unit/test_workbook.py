"""Workbooks: what goes out comes back as typed, edits find their cells, nothing else moves."""

from __future__ import annotations

import csv
import json
import zipfile
from collections.abc import Callable
from pathlib import Path

import pytest
import xlsxwriter
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from generator import spreadsheet, workbook
from generator.csvfile import parse
from generator.differences import plain
from generator.errors import DatasetError

ROOT = Path(__file__).resolve().parents[2]
KINDS = (".xlsx", ".ods")
TABLES = {
    "solvents.csv": "solvent,name,cas,smiles,synonyms,note\n"
    "water,Water,7732-18-5,O,H2O,\n"
    "methanol,Methanol,67-56-1,CO,methyl alcohol; MeOH,\n",
    "sources.csv": "source,kind,citation,year,doi\n"
    'tables,handbook-table,"Somebody, A., Tables",2014,\n',
    "measurements.csv": "solvent,quantity,value,unit,uncertainty,temperature_c,source,method,note\n"
    "water,relative_permittivity,80.1,1,,20,tables,,\n"
    "water,density,0.9970,g/cm3,,25,tables,,\n"
    "methanol,relative_permittivity,33.0,1,0.10,20,tables,,\n"
    "methanol,relative_permittivity,32.6,1,,25,tables,,\n",
    "stock.csv": "container,solvent,grade,size,location,received,opened,test_due\n"
    "P001,water,analysis,1 L,Cabinet 1,2026-01-31,,\n",
}


def _small(folder: Path) -> Path:
    folder.mkdir(parents=True, exist_ok=True)
    package = json.loads((ROOT / "data" / "datapackage.json").read_text(encoding="utf-8"))
    for resource in package["resources"]:
        header = ",".join(field["name"] for field in resource["schema"]["fields"]) + "\n"
        text = TABLES.get(resource["path"], header)
        (folder / resource["path"]).write_text(text, encoding="utf-8", newline="")
    (folder / "datapackage.json").write_text(json.dumps(package), encoding="utf-8")
    return folder


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    return _small(tmp_path / "data")


Rows = list[list[str]]


def edited(path: Path, edit: Callable[[dict[str, Rows]], object]) -> Path:
    """The workbook with its sheets changed, as a program would save it: plain text cells."""
    sheets: dict[str, Rows] = {}
    for name, rows in spreadsheet.read(path).items():
        width = max(map(len, rows), default=0)
        sheets[name] = [[str(cell) for cell in row] + [""] * (width - len(row)) for row in rows]
    edit(sheets)
    saved = path.with_name(f"saved-{path.stem}.xlsx")
    book = xlsxwriter.Workbook(str(saved))
    for name, rows in sheets.items():
        page = book.add_worksheet(name)
        for i, row in enumerate(rows):
            for j, cell in enumerate(row):
                page.write_string(i, j, cell)
    book.close()
    return saved


def cell(sheets: dict[str, Rows], table: str, line: int, column: str, text: str) -> None:
    rows = sheets[table]
    rows[line - 1][rows[0].index(column)] = text


def contents(folder: Path) -> dict[str, bytes]:
    return {path.name: path.read_bytes() for path in sorted(folder.iterdir())}


@pytest.mark.parametrize("kind", KINDS)
def test_the_shipped_tables_come_back_without_a_difference(kind: str, tmp_path: Path) -> None:
    path = tmp_path / f"tables{kind}"
    workbook.write(ROOT / "data", path)
    plan = workbook.read(ROOT / "data", path)
    assert (plan.changes, plan.files) == ((), {})
    sheets = spreadsheet.read(path)
    with (ROOT / "data" / "solvents.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    place = sheets["solvents"][0].index("cas")
    assert [row[place] for row in sheets["solvents"][1 : len(rows) + 1]] == [r["cas"] for r in rows]
    assert not any(isinstance(c, spreadsheet.Digits) for row in sheets["solvents"] for c in row)


@pytest.mark.parametrize("kind", KINDS)
def test_equal_tables_give_equal_bytes(kind: str, folder: Path, tmp_path: Path) -> None:
    first, second = tmp_path / f"1{kind}", tmp_path / f"2{kind}"
    workbook.write(folder, first)
    workbook.write(folder, second)
    assert first.read_bytes() == second.read_bytes()


ODD = [
    "=1+1", "+1", "-1", "@SUM(A1)", "00123", "75-05-8", "1/2", "0.9970", "1e5", "1,5", "TRUE",
    "#N/A", "x" * 30_000, "two\nlines", "a  b", "µ 漢字 \U0001f600", "_x0041_", "'quoted'", "&<>\"",
    "2026-12-01", "\u22121", "non\u00a0breaking", "12:30", "50 %", ";;", "a,b",
]  # fmt: skip


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("text", ODD, ids=[ascii(text[:12]) for text in ODD])
def test_odd_text_stays_text(kind: str, text: str, folder: Path, tmp_path: Path) -> None:
    file = folder / "solvents.csv"
    data = parse(file.read_bytes(), ",").patched({1: {"note": text}}, frozenset(), {})
    file.write_bytes(bytes(data))
    path = tmp_path / f"tables{kind}"
    workbook.write(folder, path)
    rows = spreadsheet.read(path)["solvents"]
    came = rows[1][rows[0].index("note")]
    assert came == text
    assert not isinstance(came, spreadsheet.Digits)
    assert workbook.read(folder, path).changes == ()


@settings(
    max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
@given(
    kind=st.sampled_from(KINDS),
    notes=st.lists(
        st.one_of(
            st.sampled_from(ODD),
            st.text(
                st.characters(exclude_categories=["Cs"], exclude_characters="\0\ufffd"), max_size=40
            ),
            st.from_regex(r"\A[=+@-]?0*[0-9]{1,4}([./-][0-9]{1,2}){0,2}([eE]-?[0-9])?\Z"),
        ),
        min_size=2,
        max_size=2,
    ),
)
def test_any_text_comes_back_as_it_went(
    kind: str, notes: list[str], tmp_path: Path, tmp_path_factory: pytest.TempPathFactory
) -> None:
    folder = _small(tmp_path_factory.mktemp("any") / "data")
    file = folder / "solvents.csv"
    edits = {i: {"note": note} for i, note in enumerate(notes, start=1)}
    written = parse(file.read_bytes(), ",").patched(edits, frozenset(), {})
    file.write_bytes(bytes(written))
    path = tmp_path / f"tables{kind}"
    workbook.write(folder, path)
    rows = spreadsheet.read(path)["solvents"]
    place = rows[0].index("note")
    assert [plain(row[place]) for row in rows[1:3]] == [plain(note) for note in notes]
    plan = workbook.read(folder, path)
    assert (plan.changes, plan.files) == ((), {})


def test_no_cell_is_a_formula_and_every_cell_is_formatted_as_text(
    folder: Path, tmp_path: Path
) -> None:
    file = folder / "solvents.csv"
    bad = '=HYPERLINK("x";"y")'
    file.write_bytes(
        bytes(parse(file.read_bytes(), ",").patched({1: {"note": bad}}, frozenset(), {}))
    )
    for kind, part in ((".xlsx", "xl/worksheets/sheet2.xml"), (".ods", "content.xml")):
        path = tmp_path / f"tables{kind}"
        workbook.write(folder, path)
        with zipfile.ZipFile(path) as archive:
            text = archive.read(part).decode()
            assert "<f>" not in text
            assert "table:formula" not in text
            if kind == ".xlsx":
                assert 'numFmtId="49"' in archive.read("xl/styles.xml").decode()  # "@", text
                assert text.count('t="s"') == text.count("<v>") > 0


def test_drop_downs_offer_quantities_units_sources_solvents_and_listed_words(
    folder: Path, tmp_path: Path
) -> None:
    path = tmp_path / "tables.xlsx"
    workbook.write(folder, path)
    sheets = spreadsheet.read(path)
    with zipfile.ZipFile(path) as archive:
        names = list(sheets)
        measurements = archive.read(
            f"xl/worksheets/sheet{names.index('measurements') + 1}.xml"
        ).decode()
        comments = archive.read("xl/comments1.xml").decode()
    for source in ("'solvents'!$A$2", "'sources'!$A$2", "'_lists'!$A$2", "'_lists'!$B$2"):
        assert source in measurements
    assert "NUMBERVALUE" in measurements
    assert 'pane ySplit="1"' in measurements
    assert 'state="frozen"' in measurements
    assert "CAS Registry Number with its hyphens" in comments
    titles, *rows = sheets["_lists"]
    lists = {title: [row[i] for row in rows if row[i]] for i, title in enumerate(titles)}
    assert "relative_permittivity" in lists["quantity"]
    assert "kirkwood_function" not in lists["quantity"]
    assert {"g/cm3", "1"} <= set(lists["unit"])
    assert lists["handling.peroxide_group"] == ["A", "B", "C"]


def test_the_first_sheet_says_what_it_is_and_which_revision(folder: Path, tmp_path: Path) -> None:
    from generator.tables import read_tables

    path = tmp_path / "tables.ods"
    workbook.write(folder, path)
    name, rows = next(iter(spreadsheet.read(path).items()))
    assert name == "About"
    assert ["Data revision", read_tables(folder).revision] in rows
    assert any("datasheets sheet in" in cell for row in rows for cell in row)


@pytest.mark.parametrize("kind", KINDS)
def test_an_edit_changes_its_cell_and_no_other_byte(
    kind: str, folder: Path, tmp_path: Path
) -> None:
    before = contents(folder)
    path = tmp_path / f"tables{kind}"
    workbook.write(folder, path)
    saved = edited(path, lambda sheets: cell(sheets, "measurements", 3, "value", "0.99700"))
    plan = workbook.read(folder, saved)
    assert [str(change) for change in plan.changes] == [
        "measurements.csv, line 3, value: 0.9970 → 0.99700   (water · density · tables · 25)"
    ]
    workbook.apply(plan)
    expected = before["measurements.csv"].replace(b"0.9970,", b"0.99700,")
    assert contents(folder) == before | {"measurements.csv": expected}


def test_rows_sorted_added_and_deleted(folder: Path, tmp_path: Path) -> None:
    path = tmp_path / "tables.xlsx"
    workbook.write(folder, path)

    def edit(sheets: dict[str, Rows]) -> None:
        head, water, density, methanol, warm = sheets["measurements"][:5]
        new = [*warm]
        new[head.index("value")], new[head.index("temperature_c")] = "30.9", "35"
        sheets["measurements"] = [head, warm, new, methanol, water]  # density deleted
        assert density[1] == "density"

    plan = workbook.read(folder, edited(path, edit))
    assert [change.kind for change in plan.changes] == ["row added", "row removed"]
    workbook.apply(plan)
    lines = (folder / "measurements.csv").read_text(encoding="utf-8").splitlines()
    assert lines == [
        line for line in TABLES["measurements.csv"].splitlines() if ",density," not in line
    ] + ["methanol,relative_permittivity,30.9,1,,35,tables,,"]


def test_separators_line_ends_quotes_blank_rows_and_mark_are_kept(
    folder: Path, tmp_path: Path
) -> None:
    text = (
        '\ufeffsolvent;name;cas;smiles;synonyms;note\r\n"water";"Water";"7732-18-5";"O";;\r\n'
        ';;;;;\r\nmethanol;Methanol;67-56-1;CO;"methyl alcohol; MeOH";'
    )
    file = folder / "solvents.csv"
    file.write_bytes(text.encode())
    path = tmp_path / "tables.xlsx"
    workbook.write(folder, path)
    assert workbook.read(folder, path).files == {}
    saved = edited(path, lambda sheets: cell(sheets, "solvents", 2, "name", "Water; pure"))
    workbook.apply(workbook.read(folder, saved))
    assert file.read_bytes().decode() == text.replace('"Water"', '"Water; pure"')

    def add(sheets: dict[str, Rows]) -> None:
        sheets["solvents"].insert(3, ["ethanol", "Ethanol", "64-17-5", "CCO", "", ""])

    workbook.apply(workbook.read(folder, edited(path, add)))
    assert file.read_bytes().decode() == (
        text.replace('"Water"', '"Water; pure"') + "\r\nethanol;Ethanol;64-17-5;CCO;;\r\n"
    )


def test_number_cells_equal_in_value_are_no_edits(folder: Path, tmp_path: Path) -> None:
    """A program that turned the text into numbers has changed no number."""
    path = tmp_path / "tables.xlsx"
    workbook.write(folder, path)
    sheets = spreadsheet.read(path)
    book = xlsxwriter.Workbook(str(tmp_path / "numbers.xlsx"), {"strings_to_numbers": True})
    for name, rows in sheets.items():
        page = book.add_worksheet(name)
        for i, row in enumerate(rows):
            for j, text in enumerate(row):
                (page.write_string if name.startswith("_") else page.write)(i, j, str(text))
    book.close()
    assert workbook.read(folder, tmp_path / "numbers.xlsx").changes == ()


def test_a_cas_number_turned_into_a_date_is_taken_as_it_is(folder: Path, tmp_path: Path) -> None:
    import datetime

    path = tmp_path / "tables.xlsx"
    workbook.write(folder, path)
    sheets = spreadsheet.read(path)
    saved = tmp_path / "dated.xlsx"
    book = xlsxwriter.Workbook(str(saved))
    day = book.add_format({"num_format": "dd.mm.yyyy"})
    for name, rows in sheets.items():
        page = book.add_worksheet(name)
        for i, row in enumerate(rows):
            for j, text in enumerate(row):
                page.write_string(i, j, text)
        if name == "solvents":
            page.write_datetime(1, rows[0].index("cas"), datetime.datetime(1975, 5, 8), day)
        if name == "stock":
            page.write_datetime(1, rows[0].index("opened"), datetime.datetime(2026, 3, 31), day)
    book.close()
    changes = workbook.read(folder, saved).changes
    assert [(c.column, c.new) for c in changes] == [
        ("cas", "1975-05-08"), ("opened", "2026-03-31"),
    ]  # fmt: skip


# --- both sides moved ---------------------------------------------------------------------------


def test_edits_on_both_sides_in_different_places_are_both_kept(
    folder: Path, tmp_path: Path
) -> None:
    path = tmp_path / "tables.ods"
    workbook.write(folder, path)
    file = folder / "measurements.csv"
    meanwhile = file.read_text(encoding="utf-8").replace("33.0,1,0.10", "33.1,1,0.10")
    meanwhile += "water,density,0.9982,g/cm3,,20,tables,,\n"
    file.write_text(meanwhile, encoding="utf-8", newline="")

    def edit(sheets: dict[str, Rows]) -> None:
        cell(sheets, "measurements", 4, "note", "ours")
        cell(sheets, "measurements", 2, "value", "80.2")

    workbook.apply(workbook.read(folder, edited(path, edit)))
    assert file.read_text(encoding="utf-8") == meanwhile.replace("80.1,1", "80.2,1").replace(
        "33.1,1,0.10,20,tables,,", "33.1,1,0.10,20,tables,,ours"
    )


def test_every_conflict_is_named_and_nothing_is_written(folder: Path, tmp_path: Path) -> None:
    path = tmp_path / "tables.xlsx"
    workbook.write(folder, path)
    file = folder / "measurements.csv"
    lines = file.read_text(encoding="utf-8").splitlines(keepends=True)
    # The first value changed, the second row deleted, the last row changed, one row added.
    lines = [lines[0], lines[1].replace("80.1", "80.3"), lines[3], lines[4].replace("32.6", "32.7")]
    lines.append("water,density,0.9982,g/cm3,,20,tables,,\n")
    file.write_text("".join(lines), encoding="utf-8", newline="")
    before = contents(folder)

    def edit(sheets: dict[str, Rows]) -> None:
        cell(sheets, "measurements", 2, "value", "80.2")
        cell(sheets, "measurements", 3, "value", "0.9971")
        rows = sheets["measurements"]
        del rows[4]
        rows.insert(4, ["water", "density", "0.9983", "g/cm3", "", "20", "tables", "", ""])

    with pytest.raises(DatasetError) as caught:
        workbook.read(folder, edited(path, edit))
    assert [(p.line, p.column, p.kind) for p in caught.value.problems] == [
        (0, "value", "changed-since"),
        (2, "value", "changed-since"),
        (4, "value", "changed-since"),
        (5, "value", "changed-since"),
    ]
    assert "80.3 (water · relative_permittivity · tables · 20)" in caught.value.problems[1].found
    assert contents(folder) == before


def test_the_same_edit_on_both_sides_is_no_conflict(folder: Path, tmp_path: Path) -> None:
    path = tmp_path / "tables.xlsx"
    workbook.write(folder, path)
    saved = edited(path, lambda sheets: cell(sheets, "measurements", 2, "value", "80.2"))
    workbook.apply(workbook.read(folder, saved))
    assert workbook.read(folder, saved).changes == ()


# --- what cannot be used ------------------------------------------------------------------------


def test_all_faults_of_a_workbook_are_told_at_once(folder: Path, tmp_path: Path) -> None:
    path = tmp_path / "tables.xlsx"
    workbook.write(folder, path)

    def edit(sheets: dict[str, Rows]) -> None:
        del sheets["stock"]
        sheets["solvents"][0][2] = "CAS number"
        sheets["measurements"][0].append("")
        sheets["measurements"][2].append("a remark")

    with pytest.raises(DatasetError) as caught:
        workbook.read(folder, edited(path, edit))
    assert {(p.file.split(" ")[-1], p.line, p.kind) for p in caught.value.problems} == {
        ("stock", 0, "missing-table"),
        ("solvents", 1, "missing-column"),
        ("solvents", 1, "unknown-column"),
        ("measurements", 3, "too-many-cells"),
    }


def test_a_workbook_of_another_origin_is_refused(folder: Path, tmp_path: Path) -> None:
    path = tmp_path / "tables.xlsx"
    workbook.write(folder, path)
    for edit in (
        lambda sheets: sheets.pop("_base"),
        lambda sheets: sheets["_base"][2].__setitem__(0, "AAAA"),
    ):
        with pytest.raises(DatasetError, match="no-base"):
            workbook.read(folder, edited(path, edit))
    (tmp_path / "no.xlsx").write_bytes(b"not a workbook")
    with pytest.raises(DatasetError, match="unreadable"):
        workbook.read(folder, tmp_path / "no.xlsx")
    with pytest.raises(ValueError, match=r"\.xlsx or \.ods"):
        workbook.write(folder, tmp_path / "tables.csv")


def test_tables_that_are_not_whole_are_refused(folder: Path, tmp_path: Path) -> None:
    (folder / "sources.csv").unlink()
    (folder / "stock.csv").write_text("container,solvent\n", encoding="utf-8")
    with pytest.raises(DatasetError) as caught:
        workbook.write(folder, tmp_path / "tables.xlsx")
    assert {p.kind for p in caught.value.problems} == {"missing-table", "missing-column"}
    assert not (tmp_path / "tables.xlsx").exists()


def test_a_cell_no_program_can_hold_is_refused(folder: Path, tmp_path: Path) -> None:
    file = folder / "solvents.csv"
    long = {1: {"note": "x" * 40_000}}
    file.write_bytes(bytes(parse(file.read_bytes(), ",").patched(long, frozenset(), {})))
    with pytest.raises(DatasetError, match="too-long"):
        workbook.write(folder, tmp_path / "tables.xlsx")


def test_a_bad_number_goes_out_and_comes_back(folder: Path, tmp_path: Path) -> None:
    """What the check complains of can be mended in the spreadsheet."""
    file = folder / "measurements.csv"
    text = file.read_text(encoding="utf-8").replace("33.0", '"33,0"')
    file.write_text(text, encoding="utf-8", newline="")
    path = tmp_path / "tables.xlsx"
    workbook.write(folder, path)
    assert workbook.read(folder, path).changes == ()
    saved = edited(path, lambda sheets: cell(sheets, "measurements", 4, "value", "33.0"))
    plan = workbook.read(folder, saved)
    with plan.tried() as copy:
        assert '"33.0"' in (copy / "measurements.csv").read_text(encoding="utf-8")
    assert file.read_text(encoding="utf-8") == text
