"""What stands in where nothing is published: estimates with their honest spread, never more.

An estimate is used only where the tables say nothing at all about a quantity; it carries the
basis ``estimated`` wherever it goes.
"""

from __future__ import annotations

import json
import math

from generator import dipoles, polarity
from generator.cache import Cache, digest
from generator.structures import Molecule

# Where no density curve is known: α = 0.345/(1.6 t_b − T), the shape of the Rackett equation with
# the critical temperature taken as 1.6 boiling points; the spread is what it misses measured
# expansivities by on the handbook's own liquids (a test holds both numbers against the data).
_EXPANSION_FACTOR = 0.345
_CRITICAL_TO_BOILING = 1.6
EXPANSION_SPREAD = 0.15
# What the Onsager equation misses measured permittivities by, as a share of ε, where molecules do
# not associate; and n² those of molecules without a moment (a test holds both against the data).
PERMITTIVITY_SPREAD = 0.20
UNPOLAR_SPREAD = 0.015
# Standard uncertainty of a value known only to lie within ± a: a/√3 (JCGM 100, 4.3.7).
_RECTANGULAR = 1 / math.sqrt(3)
_STEP = 0.5  # of an input's uncertainty, for its slope
_KIND = "dipole-estimate"


def expansivity(boiling: float, temperature: float) -> float:
    """Thermal expansivity [1/K] of a liquid of which only the boiling point is known.

    ``boiling`` [K], ``temperature`` [K].
    """
    return _EXPANSION_FACTOR / (_CRITICAL_TO_BOILING * boiling - temperature)


def dipole_moment(structure: Molecule, cache: Cache) -> tuple[float, float] | None:
    """Dipole moment [D] and standard uncertainty from the structure; None outside the model.

    Of saturated hydrocarbons only the limit of their moments is known.
    """
    if structure.dipole_limit is not None:
        return structure.dipole_limit / 2, structure.dipole_limit / 2 * _RECTANGULAR
    key = digest(structure.smiles, dipoles.fingerprint())
    kept = cache.get(_KIND, key)
    if kept is not None:
        found = json.loads(kept)
    else:
        try:
            estimate = dipoles.estimate_dipole(structure.smiles)
            found = [estimate.value, math.hypot(estimate.uncertainty, estimate.spread)]
        except ValueError:
            found = None
        cache.put(_KIND, key, json.dumps(found).encode())
    return None if found is None else (float(found[0]), float(found[1]))


def permittivity(
    structure: Molecule,
    moment: tuple[float, float],
    index: tuple[float, float],
    volume: float,
    temperature: float,
) -> tuple[float, float] | None:
    """Relative permittivity [1] and standard uncertainty; None for associated liquids.

    ``moment`` [D] and ``index`` [1] with their uncertainties, ``volume`` [cm3/mol],
    ``temperature`` [K]. Onsager, J. Am. Chem. Soc. 58, 1486 (1936); n² (Maxwell) where the
    structure leaves no moment. The correlation factor of associated liquids is not foreseeable.
    """
    if structure.dipole_limit is not None:
        value = index[0] ** 2
        return value, math.hypot(UNPOLAR_SPREAD * value, 2 * index[0] * index[1])
    if structure.is_associated:
        return None

    def at(mu: float, n: float) -> float:
        return float(polarity.onsager_permittivity(max(mu, 0.0), n, volume, temperature))

    value = at(moment[0], index[0])
    by_moment = (at(moment[0] + _STEP * moment[1], index[0]) - value) / _STEP
    by_index = (at(moment[0], index[0] + _STEP * index[1]) - value) / _STEP
    return value, math.hypot(PERMITTIVITY_SPREAD * value, by_moment, by_index)
