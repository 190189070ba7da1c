"""Adding substances: what is written, what is refused, and what is never touched."""

from __future__ import annotations

import csv
import time
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from generator import additions
from generator.dataset import load_dataset
from generator.errors import DatasetError
from generator.schema import DESCRIPTION, shipped_file, shipped_schema


def _read(path: Path, delimiter: str = ",", encoding: str = "utf-8") -> list[dict[str, str]]:
    with path.open(encoding=encoding, newline="") as file:
        return list(csv.DictReader(file, delimiter=delimiter))


def _bytes(folder: Path) -> dict[str, bytes]:
    return {path.name: path.read_bytes() for path in sorted(folder.iterdir())}


def _add(folder: Path, *names: str) -> additions.Plan:
    plan = additions.plan(folder, names)
    additions.apply(plan)
    return plan


def test_an_empty_folder_gets_its_tables(tmp_path: Path) -> None:
    plan = _add(tmp_path, "acetone", "THF")
    assert [entry.cas for entry in plan.added] == ["67-64-1", "109-99-9"]
    solvents = _read(tmp_path / "solvents.csv")
    assert [row["solvent"] for row in solvents] == ["acetone", "tetrahydrofuran"]
    assert solvents[0]["smiles"] == "CC(C)=O"
    sources = {row["source"] for row in _read(tmp_path / "sources.csv")}
    for table in ("measurements", "correlations"):
        rows = _read(tmp_path / f"{table}.csv")
        assert {row["solvent"] for row in rows} == {"acetone", "tetrahydrofuran"}
        assert {row["source"] for row in rows} <= sources
        assert all(None not in row and None not in row.values() for row in rows)


def test_a_new_folder_is_complete(tmp_path: Path) -> None:
    folder = tmp_path / "mine" / "tables"
    _add(folder, "acetone")
    tables = {table.path for table in shipped_schema().values()}
    assert set(_bytes(folder)) == {DESCRIPTION, *tables}
    assert (folder / DESCRIPTION).read_bytes() == shipped_file(DESCRIPTION)
    assert (folder / "stock.csv").read_text() == f"{','.join(shipped_schema()['stock'].columns)}\n"
    dataset = load_dataset(folder)
    assert list(dataset.solvents) == ["acetone"]
    assert dataset.usual_uncertainty("handbook-table", "relative_permittivity", 20.0)


def test_what_a_folder_has_stays(tmp_path: Path) -> None:
    (tmp_path / "uncertainties.csv").write_text("kind,quantity,absolute,relative,reason\n")
    _add(tmp_path, "acetone")
    assert (tmp_path / "uncertainties.csv").read_text().count("\n") == 1
    (tmp_path / "stock.csv").unlink()
    _add(tmp_path, "toluene")
    assert not (tmp_path / "stock.csv").exists(), "a table gone missing is for the check to report"


def test_a_plan_writes_nothing(tmp_path: Path) -> None:
    _add(tmp_path, "acetone")
    before = _bytes(tmp_path)
    plan = additions.plan(tmp_path, ["toluene"])
    text = plan.summary(rows=True)
    assert _bytes(tmp_path) == before
    assert "toluene | Toluene | 108-88-3" in text
    assert "toluene | relative_permittivity | 2.379" in text


def test_adding_twice_changes_nothing(tmp_path: Path) -> None:
    _add(tmp_path, "acetone", "water")
    before = _bytes(tmp_path)
    plan = _add(tmp_path, "67-64-1", "H2O")
    assert plan.added == ()
    assert plan.present == ("Acetone (67-64-1)", "Water (7732-18-5)")
    assert _bytes(tmp_path) == before


def test_one_substance_named_twice_is_added_once(tmp_path: Path) -> None:
    plan = _add(tmp_path, "acetone", "67641", "propanone")
    assert len(plan.added) == 1
    assert len(_read(tmp_path / "solvents.csv")) == 1


def test_a_number_typed_without_hyphens_counts_as_present(tmp_path: Path) -> None:
    (tmp_path / "solvents.csv").write_text(
        "solvent,name,cas,smiles,synonyms,note\nmine,Our acetone,67641,CC(C)=O,,\n"
    )
    assert additions.plan(tmp_path, ["acetone"]).added == ()


def test_ambiguous_and_unknown_names_stop_everything(tmp_path: Path) -> None:
    plan = additions.plan(tmp_path, ["acetone", "xylene", "no such liquid"])
    assert [refusal.name for refusal in plan.refusals] == ["xylene", "no such liquid"]
    text = plan.summary()
    for part in ("95-47-6  o-Xylene", "108-38-3  m-Xylene", "106-42-3  p-Xylene"):
        assert part in text
    with pytest.raises(ValueError, match="doubt"):
        additions.apply(plan)
    assert list(tmp_path.iterdir()) == []


def test_slugs_stay_unique_beside_those_the_laboratory_chose(tmp_path: Path) -> None:
    (tmp_path / "solvents.csv").write_text(
        "solvent,name,cas,smiles,synonyms,note\nacetone,Acetone for rinsing,,CC(C)=O,,\n"
    )
    _add(tmp_path, "acetone")
    slugs = [row["solvent"] for row in _read(tmp_path / "solvents.csv")]
    assert slugs == ["acetone", "acetone-67-64-1"]
    measured = _read(tmp_path / "measurements.csv")
    assert {row["solvent"] for row in measured} == {"acetone-67-64-1"}


@pytest.mark.parametrize(
    ("name", "slug"),
    [
        ("γ-Butyrolactone", "gamma-butyrolactone"),
        ("N-Methyl-2-pyrrolidone", "n-methyl-2-pyrrolidone"),
        ("cis-1,2-Dichloroethylene", "cis-1-2-dichloroethylene"),
        ("(±)-Limonene", "limonene"),
        ("Pinène", "pinene"),
    ],
)
def test_slugs_are_readable(name: str, slug: str) -> None:
    assert additions.slug(name) == slug


_HEADER = list(shipped_schema()["measurements"].columns)
_TYPED = ["acetone", "viscosity", "0.31", "mPa s", "0.01", "25", "own", "", "Ørsted, 2,5 % „rest“"]


@pytest.mark.parametrize("newline", ["\n", "\r\n"])
@pytest.mark.parametrize("delimiter", [",", ";"])
@pytest.mark.parametrize("bom", [b"", b"\xef\xbb\xbf"])
@pytest.mark.parametrize("tail", ["", "{n}", "{n}{d}{d}{d}{n}", "{n}{n}"])
def test_what_stands_in_a_file_stays_byte_for_byte(
    tmp_path: Path, newline: str, delimiter: str, bom: bytes, tail: str
) -> None:
    path = tmp_path / "measurements.csv"
    order = [_HEADER.index(name) for name in reversed(_HEADER)]
    quoted = ['"' + _TYPED[i] + '"' for i in order]
    text = delimiter.join(_HEADER[i] for i in order) + newline + delimiter.join(quoted)
    end = tail.format(n=newline, d=delimiter)
    path.write_bytes(bom + (text + end).encode())
    before = path.read_bytes()
    _add(tmp_path, "toluene")
    after = path.read_bytes()
    kept = before.removesuffix(end.encode()) if end else before
    assert after.startswith(kept)
    assert after.endswith(end.encode() or newline.encode())
    added = after[len(kept) :].decode()
    assert ("\r\n" in added) == (newline == "\r\n")
    assert added.replace(newline, "").count("\n") == 0
    rows = [row for row in _read(path, delimiter, "utf-8-sig") if any(row.values())]
    assert rows[0] == dict(zip(_HEADER, _TYPED, strict=True))
    assert {row["solvent"] for row in rows[1:]} == {"toluene"}
    assert {"relative_permittivity", "density"} <= {row["quantity"] for row in rows[1:]}


def test_a_file_in_an_old_encoding_keeps_it(tmp_path: Path) -> None:
    path = tmp_path / "sources.csv"
    old = "source,kind,citation,year,doi\nown,laboratory,Messbuch Müller,2020,\n".encode("cp1252")
    path.write_bytes(old)
    _add(tmp_path, "acetone")
    assert path.read_bytes().startswith(old)
    citations = [row["citation"] for row in _read(path, encoding="cp1252")]
    assert any(text.startswith("Müller, K.; Mokrushina") for text in citations)


def test_sources_already_there_are_not_written_again(tmp_path: Path) -> None:
    _add(tmp_path, "acetone")
    _add(tmp_path, "toluene")
    keys = [row["source"] for row in _read(tmp_path / "sources.csv")]
    assert len(keys) == len(set(keys))


def test_a_lost_column_is_reported_with_its_place(tmp_path: Path) -> None:
    (tmp_path / "measurements.csv").write_text("solvent,quantity,value,unit,source\n")
    with pytest.raises(DatasetError) as caught:
        additions.plan(tmp_path, ["acetone"])
    assert {(p.file, p.line, p.column) for p in caught.value.problems} == {
        ("measurements.csv", 1, "uncertainty"),
        ("measurements.csv", 1, "temperature_c"),
        ("measurements.csv", 1, "method"),
        ("measurements.csv", 1, "note"),
    }
    assert [path.name for path in tmp_path.iterdir()] == ["measurements.csv"]


_CELLS = st.text(st.characters(codec="utf-8", exclude_categories=["Cs", "Cc"]), max_size=12)


@settings(max_examples=25, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.lists(st.tuples(_CELLS, _CELLS), max_size=4))
def test_typed_rows_survive_whatever_they_hold(
    tmp_path_factory: pytest.TempPathFactory, cells: list[tuple[str, str]]
) -> None:
    folder = tmp_path_factory.mktemp("typed")
    path = folder / "solvents.csv"
    with path.open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file)
        writer.writerow(shipped_schema()["solvents"].columns)
        for i, (name, note) in enumerate(cells):
            writer.writerow([f"own-{i}", name, "", "C", "", note])
    before = path.read_bytes()
    additions.apply(additions.plan(folder, ["acetone"]))
    assert path.read_bytes().startswith(before)
    assert len(_read(path)) == len(cells) + 1


@pytest.mark.build
def test_all_liquids_at_once(tmp_path: Path) -> None:
    start = time.process_time()
    plan = additions.plan(tmp_path, [], all_liquids=True)
    additions.apply(plan)
    assert time.process_time() - start < 40
    assert len(plan.added) >= 1000
    assert plan.refusals == ()
    slugs = [row["solvent"] for row in _read(tmp_path / "solvents.csv")]
    assert len(slugs) == len(set(slugs)) == len(plan.added)
    with_permittivity = {
        row["solvent"]
        for row in _read(tmp_path / "measurements.csv")
        if row["quantity"] == "relative_permittivity"
    }
    assert with_permittivity == set(slugs)
