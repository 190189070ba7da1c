"""Which of CAS number and structure is wrong, where they stand for different substances."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import pytest

from generator import casnumbers, identity
from generator.dataset import Measurement, Solvent
from generator.metrics import Handbook

# CAS registry numbers, from memory.
ACETONE, PROPANAL, TOLUENE = "67-64-1", "123-38-6", "108-88-3"


def solvent(name: str, cas: str, smiles: str, synonyms: tuple[str, ...] = ()) -> Solvent:
    return Solvent(name.lower(), name, cas, smiles, synonyms, "", 2)


def test_who_is_right_is_left_alone() -> None:
    assert identity.wrong_cell(solvent("Acetone", ACETONE, "CC(C)=O")) == ""
    # written flat, a racemate does not clash with its stated shape
    assert identity.wrong_cell(solvent("2-Butanol", "78-92-2", "CCC(C)O")) == ""


def test_an_isomers_structure_is_named_by_the_name() -> None:
    who = identity.identify(solvent("Acetone", ACETONE, "CCC=O"))
    assert (who.wrong, who.relation, who.likely_cas) == ("smiles", "isomer", PROPANAL)
    assert who.why == ("the name Acetone",)
    assert identity.identify(solvent("Acetone", ACETONE, "Cc1ccccc1")).relation == "different"


def test_another_substances_number_is_named_by_the_name() -> None:
    who = identity.identify(solvent("Acetone", TOLUENE, "CC(C)=O"))
    assert (who.wrong, who.likely_cas) == ("cas", ACETONE)


def test_a_number_nobody_knows_is_named_where_the_name_confirms_the_structure() -> None:
    body = "67-65"
    unknown = f"{body}-{casnumbers.check_digit('6765')}"
    assert casnumbers.is_valid(unknown)
    assert identity.wrong_cell(solvent("Acetone", unknown, "CC(C)=O")) == "cas"
    # without a name that the library knows it proves nothing
    assert identity.wrong_cell(solvent("House solvent", unknown, "CC(C)=O")) == ""


def _rows(handbook: Handbook, slug: str) -> Sequence[Measurement]:
    return [row for row in handbook.dataset.measurements if row.solvent == slug]


def test_copied_rows_decide_where_the_name_is_of_no_use(handbook: Handbook) -> None:
    toluene = replace(handbook.dataset.solvents["toluene"], name="Solvent 7", synonyms=())
    rows = _rows(handbook, "toluene")
    assert identity.wrong_cell(replace(toluene, smiles="CC(C)=O"), rows) == "smiles"
    assert identity.wrong_cell(replace(toluene, cas=ACETONE), rows) == "cas"


@pytest.mark.parametrize("shipped", ["toluene", "acetone", "1-4-dioxane"])
def test_open_tables_print_the_shipped_rows(handbook: Handbook, shipped: str) -> None:
    prints = identity.printed(handbook.dataset.solvents[shipped].cas)
    copied = [r for r in _rows(handbook, shipped) if (r.quantity, r.source) in prints]
    assert len(copied) > 5
    for row in copied:
        assert prints[row.quantity, row.source].value == row.printed
    assert identity.printed("999-99-9") == {}


def test_half_a_unit_of_the_last_digit() -> None:
    assert identity.Print("1.4264", "1").half_width == pytest.approx(5e-5)
    assert identity.Print("54", "K").half_width == pytest.approx(0.5)
