"""What changed: cells, numbers, classes, findings and sheets, told as the handbooks differ."""

from __future__ import annotations

import csv
import datetime
import io
import json
import shutil
import subprocess
from collections import Counter
from collections.abc import Callable, Iterable
from pathlib import Path

import pytest
import xlsxwriter
from click.testing import CliRunner
from hypothesis import given, settings
from hypothesis import strategies as st

from generator import changes, changetext, history, spreadsheet, versions, workbook
from generator.changes import State, compare
from generator.cli import main
from generator.differences import CELL
from generator.errors import DatasetError
from generator.exports import values_of
from generator.metrics import Settings
from generator.tablefiles import read_whole

ROOT = Path(__file__).resolve().parents[2]
SLUGS = {"water", "acetone", "benzene", "toluene", "ethanol", "1-butanol"}
CONFIG = "site_name: Small\nplugins:\n  - datasheets:\n      data: tables\n"


def _small(folder: Path) -> Path:
    """The shipped tables with six substances."""
    folder.mkdir(parents=True)
    for path in (ROOT / "data").iterdir():
        if path.suffix != ".csv":
            shutil.copy(path, folder)
            continue
        with path.open(encoding="utf-8", newline="") as file:
            head, *rows = csv.reader(file)
        if "solvent" in head:
            place = head.index("solvent")
            rows = [row for row in rows if row[place] in SLUGS]
        text = io.StringIO(newline="")
        csv.writer(text, lineterminator="\n").writerows([head, *rows])
        (folder / path.name).write_text(text.getvalue(), encoding="utf-8", newline="")
    header = (ROOT / "data" / "history.csv").read_text(encoding="utf-8").splitlines()[0]
    (folder / "history.csv").write_text(header + "\n", encoding="utf-8")
    return folder


@pytest.fixture(scope="session")
def small(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return _small(tmp_path_factory.mktemp("small") / "tables")


@pytest.fixture(scope="session")
def before(small: Path) -> State:
    return changes.state(small, Settings())


@pytest.fixture
def lab(small: Path, tmp_path: Path) -> Path:
    """A copy of the small tables with settings beside it."""
    shutil.copytree(small, tmp_path / "tables")
    (tmp_path / "mkdocs.yml").write_text(CONFIG, encoding="utf-8")
    (tmp_path / "docs").mkdir()
    return tmp_path / "tables"


def edit(folder: Path, table: str, where: Callable[[dict[str, str]], bool], **cells: str) -> int:
    """Change cells of the one row that fits; its line."""
    path = folder / f"{table}.csv"
    with path.open(encoding="utf-8", newline="") as file:
        reader = csv.DictReader(file)
        rows = list(reader)
    (index,) = (i for i, row in enumerate(rows) if where(row))
    rows[index] |= cells
    text = io.StringIO(newline="")
    writer = csv.DictWriter(text, list(rows[0]), lineterminator="\n")
    writer.writeheader()
    writer.writerows(rows)
    path.write_text(text.getvalue(), encoding="utf-8", newline="")
    return index + 2


def printed_of(row: dict[str, str]) -> bool:
    """The measured permittivity of benzene from the table of permittivities."""
    return (row["solvent"], row["quantity"], row["source"]) == (
        "benzene", "relative_permittivity", "crc-permittivity",
    )  # fmt: skip


def test_equal_tables_differ_in_nothing(before: State) -> None:
    found = compare(before, before)
    assert not any((found.entries, found.moves, found.flips, found.appeared, found.settled))
    assert (found.outdated, found.withdrawn, found.errors) == ((), (), (0, 0))


def test_one_value_moves_what_follows_from_it_and_nothing_else(before: State, lab: Path) -> None:
    edit(lab, "correlations", lambda r: r["solvent"] == "benzene" and "permitt" in r["quantity"],
         solvent="toluene", source="laboratory")  # fmt: skip
    edit(lab, "sources", lambda r: r["source"] == "crc-permittivity")
    line = edit(lab, "measurements", printed_of, value="9.9")
    sources = lab / "sources.csv"
    sources.write_text(sources.read_text(encoding="utf-8") + "laboratory,laboratory,Own,2026,\n",
                       encoding="utf-8")  # fmt: skip
    after = changes.state(lab, Settings())
    assert after.handbook is not None, after.findings
    found = compare(before, after)
    cell = next(c for c in found.entries if c.column == "value")
    assert (cell.file, cell.line, cell.kind, cell.new) == ("measurements.csv", line, CELL, "9.9")
    moved = {(m.solvent, m.quantity) for m in found.moves}
    assert ("benzene", "relative_permittivity") in moved
    assert ("benzene", "kirkwood_function") in moved
    assert {slug for slug, _ in moved} <= {"benzene", "toluene"}
    assert ("benzene", "density") not in moved
    assert ("benzene", "polarity", "unpolar", "polar") in {
        (f.solvent, f.what, f.old, f.new) for f in found.flips
    }
    assert "benzene" in found.outdated
    assert not {"water", "acetone", "ethanol"} & set(found.outdated)
    assert any(c.solvent == "benzene" for c in found.appeared)
    back = compare(after, before)
    assert Counter(c.problem.kind for c in back.settled) == Counter(
        c.problem.kind for c in found.appeared
    )


def test_moves_are_the_numbers_that_are_printed_otherwise(before: State, lab: Path) -> None:
    edit(lab, "measurements", printed_of, value="2.35")
    after = changes.state(lab, Settings())
    assert before.handbook is not None
    assert after.handbook is not None
    moves = {(m.quantity, m.temperature): m for m in compare(before, after).moves}
    old = {(v.quantity, v.temperature): v for v in values_of(before.handbook, "benzene")}
    new = {(v.quantity, v.temperature): v for v in values_of(after.handbook, "benzene")}
    assert moves
    for key, value in new.items():
        was = old[key]
        move = moves.get((key[0], None if key[1] is None else round(key[1], 3)))
        if move is None:
            # Not printed otherwise: it moved by less than its uncertainty shows.
            assert abs(value.value - was.value) <= 0.1 * max(was.uncertainty, value.uncertainty)
        else:
            step = value.value - was.value
            assert move.shift == (
                pytest.approx(step / was.uncertainty) if was.uncertainty else None
            )


def test_new_and_withdrawn_substances(before: State, lab: Path) -> None:
    for path in lab.glob("*.csv"):
        lines = path.read_text(encoding="utf-8").splitlines(keepends=True)
        kept = [line for line in lines if "toluene" not in line.split(",")]
        path.write_text("".join(kept), encoding="utf-8", newline="")
    fewer = changes.state(lab, Settings())
    gone, came = compare(before, fewer), compare(fewer, before)
    assert gone.withdrawn == ("toluene",)
    assert "toluene" in came.outdated
    assert "no longer there: take its sheet down" in changetext.text(gone)
    assert not [m for m in (*gone.moves, *came.moves) if m.solvent == "toluene"]
    rows = [e for e in changetext.events(came, "2026-11-30", "") if e.solvent == "toluene"]
    assert len([e for e in rows if e.what.startswith("measurements.csv")]) == 1


def test_tables_with_errors_are_still_compared_cell_by_cell(before: State, lab: Path) -> None:
    line = edit(lab, "measurements", printed_of, unit="furlong")
    broken = changes.state(lab, Settings())
    assert broken.handbook is None
    found = compare(before, broken)
    assert not found.compared
    assert [(c.line, c.column, c.new) for c in found.entries] == [(line, "unit", "furlong")]
    assert (found.moves, found.outdated) == ((), ())
    assert any(c.problem.line == line for c in found.appeared)
    assert "numbers are not compared" in changetext.text(found)


FREE = {
    "solvents": ("note", "synonyms"), "measurements": ("value", "uncertainty", "note"),
    "sources": ("citation", "doi"), "handling": ("storage",), "stock": ("location", "opened"),
}  # fmt: skip


@settings(max_examples=40, deadline=None)
@given(st.data())
def test_random_edits_of_a_folder_are_told_exactly(
    small: Path, tmp_path_factory: pytest.TempPathFactory, data: st.DataObject
) -> None:
    folder = tmp_path_factory.mktemp("edited") / "tables"
    shutil.copytree(small, folder)
    _, files = read_whole(folder)
    expected: dict[tuple[str, int, str], tuple[str, str]] = {}
    for number in range(data.draw(st.integers(0, 8))):
        table = data.draw(st.sampled_from(sorted(FREE)))
        file = files[table]
        position = data.draw(st.sampled_from(file.body))
        column = data.draw(st.sampled_from(FREE[table]))
        record = file.records[position]
        was = dict(zip(file.columns, record.cells, strict=False)).get(column, "")
        place = (f"{table}.csv", record.line, column)
        expected[place] = (expected.get(place, (was, ""))[0], f"edit {number}")
        edits = {position: {column: f"edit {number}"}}
        files[table] = file.patched(edits, frozenset(), {})
    for table, file in files.items():
        (folder / f"{table}.csv").write_bytes(bytes(file))
    old, new = (State("", _grids(each), None, ()) for each in (small, folder))
    told = {(c.file, c.line, c.column): (c.old, c.new) for c in compare(old, new).entries}
    assert told == expected


def _grids(folder: Path) -> dict[str, changes.Grid]:
    tables, files = read_whole(folder)
    return {name: changes.grid_of(file, tables[name].schema) for name, file in files.items()}


def test_json_holds_what_the_text_says(before: State, lab: Path) -> None:
    edit(lab, "measurements", printed_of, value="9.9")
    found = compare(before, changes.state(lab, Settings()))
    whole = json.loads(json.dumps(changetext.as_dict(found), allow_nan=False))
    assert len(whole["numbers"]) == len(found.moves)
    assert whole["entries"][0]["new"] == "9.9"
    numbers = [n for n in whole["numbers"] if n["quantity"] == "relative_permittivity"]
    assert any(n["new"]["value"] > n["old"]["value"] for n in numbers)
    text = changetext.text(found)
    assert "Benzene (benzene)" in text
    assert f"{len(found.moves)} numbers of 1 substance moved" in text
    assert "polarity: unpolar → polar" in text
    assert "printed sheet out of date" in text


# --- where versions are -------------------------------------------------------------------------


def _git(folder: Path, *arguments: str) -> None:
    own = ["-c", "user.name=Tests", "-c", "user.email=tests@example.org"]
    subprocess.run(["git", *own, *arguments], cwd=folder, check=True, capture_output=True)


def test_versions_are_found_in_folders_sites_and_git(lab: Path, tmp_path: Path) -> None:
    top = lab.parent
    _git(top, "init", "--quiet")
    _git(top, "add", "tables")
    _git(top, "commit", "--quiet", "-m", "first")
    old = (lab / "measurements.csv").read_bytes()
    edit(lab, "measurements", printed_of, value="2.29")
    with versions.opened("HEAD", lab) as folder:
        assert (folder / "measurements.csv").read_bytes() == old
        assert {p.name for p in folder.iterdir()} == {p.name for p in lab.iterdir()}
    with versions.opened(str(lab), lab) as folder:
        assert folder == lab
    site = tmp_path / "site"
    shutil.copytree(lab, site / "downloads" / "data")
    with versions.opened(str(site), lab) as folder:
        assert (folder / "datapackage.json").exists()
    for name in ("no-such-revision", "--help", str(tmp_path / "docs")):
        with pytest.raises(versions.UnknownVersionError), versions.opened(name, lab):
            pass


# --- on record ----------------------------------------------------------------------------------


def _events(count: int, revision: str = "0123abcd") -> Iterable[history.Event]:
    return [
        history.Event("2026-11-30", revision, "water", "density", "entry", f'said "{i}", twice')
        for i in range(count)
    ]


def test_recording_adds_rows_behind_the_last_and_leaves_the_revision(lab: Path) -> None:
    tables, _ = read_whole(lab)
    history.record(lab, list(_events(2)))
    once = (lab / "history.csv").read_bytes()
    history.record(lab, list(_events(1, "4567abcd")))
    assert (lab / "history.csv").read_bytes().startswith(once)
    again, _ = read_whole(lab)
    assert again.revision == tables.revision
    assert not [p for p in again.problems if p.severity == "error"]
    assert [(e.revision, e.what) for e in history.events(again)] == [
        ("0123abcd", 'said "0", twice'),
        ("0123abcd", 'said "1", twice'),
        ("4567abcd", 'said "0", twice'),
    ]
    with pytest.raises(DatasetError, match="0123abcd is recorded already"):
        history.record(lab, list(_events(1)))


def test_a_folder_without_the_table_of_revisions(lab: Path) -> None:
    package = json.loads((lab / "datapackage.json").read_text(encoding="utf-8"))
    package["resources"] = [r for r in package["resources"] if r["name"] != "history"]
    (lab / "datapackage.json").write_text(json.dumps(package), encoding="utf-8")
    assert history.events(read_whole(lab)[0]) == ()
    with pytest.raises(DatasetError, match="no table called history"):
        history.record(lab, list(_events(1)))


# --- the command --------------------------------------------------------------------------------


def test_command_shows_and_records(small: Path, lab: Path) -> None:
    run = CliRunner().invoke
    config = str(lab.parent / "mkdocs.yml")
    edit(lab, "measurements", printed_of, value="2.30")
    shown = run(main, ["changes", str(small), "--config", config])
    assert shown.exit_code == 0, shown.output
    assert "measurements.csv" in shown.output
    assert "→ 2.30" in shown.output
    assert (lab / "history.csv").read_bytes() == (small / "history.csv").read_bytes()
    recorded = run(
        main,
        ["changes", str(small), "--config", config, "--record", "--note", "Looked up", "--date",
         "2026-11-30"],
    )  # fmt: skip
    assert recorded.exit_code == 0, recorded.output
    events = history.events(read_whole(lab)[0])
    assert (events[0].kind, events[0].what, events[0].date) == ("note", "Looked up", "2026-11-30")
    assert {e.solvent for e in events[1:]} == {"benzene"}
    assert {"entry", "number"} <= {e.kind for e in events}
    assert run(main, ["changes", str(small), "--config", config, "--record"]).exit_code == 1
    assert run(main, ["changes", "nowhere", "--config", config]).exit_code == 2
    assert run(main, ["changes", "--config", config, "--note", "x"]).exit_code == 2


def test_sheet_commands(lab: Path, tmp_path: Path) -> None:
    run = CliRunner().invoke
    book = tmp_path / "tables.xlsx"
    out = run(main, ["sheet", "out", str(book), "--data", str(lab)])
    assert out.exit_code == 0, out.output
    same = run(main, ["sheet", "in", str(book), "--data", str(lab)])
    assert same.exit_code == 0, same.output
    assert "nothing to change" in same.output
    line = edit(lab, "measurements", printed_of, value="2.30")
    run(main, ["sheet", "out", str(book), "--data", str(lab)])
    edit(lab, "measurements", printed_of, value="2.2825")
    stale = run(main, ["sheet", "in", str(book), "--data", str(lab)])
    assert "nothing to change" in stale.output  # the tables moved on, the workbook did not
    assert f"line {line}" not in stale.output
    wrong = run(main, ["sheet", "out", str(tmp_path / "tables.txt"), "--data", str(lab)])
    assert wrong.exit_code == 2


def test_sheet_in_shows_then_writes_then_tells_what_the_check_says(
    lab: Path, tmp_path: Path
) -> None:
    """A CAS number that a program took for a date is written as it came, and named."""
    book, saved = tmp_path / "tables.ods", tmp_path / "saved.xlsx"
    workbook.write(lab, book)
    made = xlsxwriter.Workbook(str(saved))
    for name, rows in spreadsheet.read(book).items():
        page = made.add_worksheet(name)
        for i, row in enumerate(rows):
            for j, text in enumerate(row):
                day = datetime.date(2067, 6, 1) if text == "67-64-1" else None
                date = made.add_format({"num_format": "d/m/yyyy"}) if day else None
                page.write_datetime(i, j, day, date) if day else page.write_string(i, j, text)
    made.close()
    run, before = CliRunner().invoke, (lab / "solvents.csv").read_bytes()
    tried = run(main, ["sheet", "in", str(saved), "--data", str(lab), "--dry-run"])
    assert tried.exit_code == 1
    assert "cas: 67-64-1 → 2067-06-01" in tried.output
    assert "column cas" in tried.output.partition("then have errors")[2]
    assert (lab / "solvents.csv").read_bytes() == before
    done = run(main, ["sheet", "in", str(saved), "--data", str(lab)])
    assert done.exit_code == 1
    assert (lab / "solvents.csv").read_bytes() == before.replace(b"67-64-1", b"2067-06-01")
