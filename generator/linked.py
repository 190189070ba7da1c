"""What a datasheet hands on: how to cite it, and itself as schema.org JSON-LD for machines."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from generator.contexts import Foot, Number, QuantityRow
from generator.dataset import Solvent
from generator.metrics import Handbook
from generator.quantities import QUANTITIES
from generator.wording import split_value


def identity(handbook: Handbook, slug: str, root: str) -> dict[str, str]:
    """Who a substance is, and where its numbers are as CSV; ``root`` leads to the top."""
    solvent, molecule = handbook.dataset.solvents[slug], handbook.molecules[slug]
    return {
        "name": solvent.name,
        "cas": solvent.cas,
        "formula": molecule.formula,
        "molar_mass": split_value(
            molecule.molar_mass, None, QUANTITIES["molar_mass"].decimals
        )[0],
        "smiles": molecule.smiles,
        "inchi": molecule.inchi,
        "inchikey": molecule.inchikey,
        "csv": f"{root}downloads/solvents/{slug}.csv",
    }  # fmt: skip


def quotation(solvent: Solvent, permittivity: Number | None, foot: Foot) -> str:
    """How to cite the sheet, its permittivity included."""
    value = f": relative permittivity {permittivity.sentence}" if permittivity else ""
    return (
        f"{solvent.name} ({solvent.cas}){value}. {foot.laboratory}, Solvent handbook, "
        f"data revision {foot.revision}."
    )


def dataset_description(
    identity: Mapping[str, str], values: Sequence[QuantityRow], laboratory: str, revision: str
) -> dict[str, Any]:
    """A Dataset about a ChemicalSubstance, one PropertyValue for each number shown.

    ``identity`` holds ``name``, ``cas``, ``formula``, ``molar_mass`` [g/mol], ``smiles``,
    ``inchi``, ``inchikey`` and ``csv``, the address of the numbers as CSV. Nothing in it is
    fetched by a browser; the vocabulary is named, not loaded.
    """
    substance = {
        "@type": ["ChemicalSubstance", "MolecularEntity"],
        "name": identity["name"],
        "identifier": f"CAS {identity['cas']}",
        "molecularFormula": identity["formula"],
        "molecularWeight": f"{identity['molar_mass']} g/mol",
        "smiles": identity["smiles"],
        "inChI": identity["inchi"],
        "inChIKey": identity["inchikey"],
    }
    return {
        "@context": "https://schema.org",
        "@type": "Dataset",
        "name": f"{identity['name']} ({identity['cas']}): permittivity and polarity",
        "description": (
            f"Permittivity, polarity and other properties of {identity['name']} with standard "
            "uncertainties, temperatures and sources."
        ),
        "version": revision,
        "creator": {"@type": "Organization", "name": laboratory},
        "about": substance,
        "distribution": {
            "@type": "DataDownload",
            "encodingFormat": "text/csv",
            "contentUrl": identity["csv"],
        },
        "variableMeasured": [_property(r.name, r.number) for r in values if r.number],
    }


def _property(name: str, number: Number) -> dict[str, Any]:
    return {
        "@type": "PropertyValue",
        "name": name,
        "value": float(number.raw),
        "unitText": number.unit or "1",
        "description": number.sentence,
        "measurementTechnique": number.basis,
    }
