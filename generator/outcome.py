"""One comparison between cells, and the list of all kinds of comparison."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np

from generator.facts import TEMPERATURE, Array, Curve, Point

LEAST_CERTAIN = 0.1
# Unit of the checks that compare no numbers.
YES_OR_NO = "yes or no"


@dataclass(frozen=True, slots=True)
class Check:
    """One kind of cross-check.

    ``relative``: the sides are compared by ratio (spreads are shares), else by difference [unit].
    ``resolution`` is the least spread taken as usual: a quarter of the least difference that is
    worth a reader's time. ``trust`` caps what the check can add to the case against a cell: a
    rule of thumb fails for odd molecules more often than a table is wrong, a comparison of two
    prints of one number does not. ``echo``: one side only repeats the other, so that their
    agreement says nothing about the number itself. ``learnt``: the data teach the usual spread;
    a bound or a copy has none to teach.
    """

    name: str
    title: str
    relative: bool
    unit: str
    resolution: float
    trust: float = math.inf
    echo: bool = False
    learnt: bool = True


_LIST = (
    Check("identity", "structure against CAS number", False, YES_OR_NO, 0.1, learnt=False),
    Check("name", "name and copied rows against CAS number and structure", False, YES_OR_NO, 0.1,
          6.0, learnt=False),
    Check("copied", "value against the table it is said to be from", True, "", 1e-4,
          echo=True, learnt=False),
    Check("copied-temperature", "temperature against the table it is said to be from", False,
          "K", 0.2, echo=True, learnt=False),
    Check("worked-out", "a point against the curve worked out from it", True, "", 0.003,
          echo=True, learnt=False),
    Check("refraction", "molar refraction from n and ρ against the structure", True, "cm3/mol",
          0.006, 6.5),
    Check("index", "refractive index against the structure", True, "1", 0.004, 3.2),
    Check("volume", "molar volume from ρ against the structure", True, "cm3/mol", 0.01, 3.2),
    Check("series-volume", "molar volume against the homologous series", True, "cm3/mol", 0.008,
          4.5),
    Check("index-square", "ε of an unpolar liquid against n²", True, "1", 0.006, 5.0),
    Check("below-index-square", "ε below n²", True, "1", 0.0065, 6.0, learnt=False),
    Check("onsager", "ε against the Onsager equation from μ, n and V", True, "1", 0.05, 4.5),
    Check("associated", "ε of an associated liquid against the Onsager equation", True, "1", 0.1,
          3.0),
    Check("estimated-onsager", "ε against the Onsager equation from the estimated μ", True, "1",
          0.05, 3.2),
    Check("moment", "ε against similar structures by the Onsager equation", True, "1", 0.10, 1.5),
    Check("series-moment", "ε against the homologous series by the Onsager equation", True, "1",
          0.06, 3.4),
    Check("own-curve", "a point against the curve of the same table", True, "", 0.01, echo=True),
    Check("curve", "a point against a curve of the same quantity", True, "", 0.0028),
    Check("curves", "two curves of one quantity", True, "", 0.0033),
    Check("pressure-curves", "two vapour pressure curves", True, "kPa", 0.04),
    Check("viscosity-curves", "two viscosity curves", True, "mPa s", 0.08),
    Check("permittivities", "two sources of the permittivity", True, "1", 0.01),
    Check("densities", "two sources of the density", True, "g/cm3", 0.0028),
    Check("indices", "two sources of the refractive index", True, "1", 0.0007),
    Check("slope", "dε/dT against expansion and thermal agitation", False, "1/K", 0.0008, 2.0),
    Check("moments", "two published dipole moments", False, "D", 0.1),
    Check("symmetry", "dipole moment of a molecule that symmetry leaves none", False, "D", 0.03,
          learnt=False),
    Check("estimate", "dipole moment against the one estimated from the structure", False, "D",
          0.15, 4.5),
    Check("melting-points", "two sources of the melting point", False, "degC", 4.0),
    Check("boiling-points", "two sources of the boiling point", False, "degC", 2.5),
    Check("flash-points", "two sources of the flash point", False, "degC", 6.7),
    Check("pressure", "vapour pressure against the boiling point", True, "kPa", 0.1, 3.0),
    Check("bounds", "a curve against the bounds of all liquids", True, "", 0.05, 6.0,
          learnt=False),
    Check("vapour", "boiling point against the vapour pressure curve", False, "degC", 2.0),
    Check("boiling", "boiling point against the structure", True, "K", 0.02, 3.2),
    Check("series-boiling", "boiling point against the homologous series", True, "K", 0.012, 4.0),
    Check("flash", "flash point against the boiling point", True, "K", 0.02, 3.2),
    Check("melting", "melting point against the boiling point, both in kelvin", True, "K", 0.03,
          3.0),
    Check("insulator", "conductivity of a hydrocarbon", True, "S/m", 1.6, 6.0, learnt=False),
    Check("repeated", "the same conductivity for unrelated liquids", False, "1", 1.2, 6.0,
          learnt=False),
    Check("order", "melting point against the boiling point", False, "degC", 2.7, 6.0,
          learnt=False),
    Check("liquid-range", "temperature of a value against the liquid range", False, "K", 10.0,
          5.0, learnt=False),
    Check("usual-temperature", "temperature of a value against room temperature", False, "K",
          2.6, 4.5, learnt=False),
)  # fmt: skip
CHECKS: Mapping[str, Check] = MappingProxyType({check.name: check for check in _LIST})


@dataclass(frozen=True, slots=True)
class Outcome:
    """One comparison. ``found`` and ``expected`` may be arrays; ``own`` is their own uncertainty.

    ``group`` is what the comparison's usual spread is learnt over; ``weight`` stretches that
    spread for this one comparison. ``members`` are the cells that took part.
    """

    check: str
    group: str
    members: tuple[str, ...]
    found: Array
    expected: Array
    own: float
    what_found: str
    what_expected: str
    weight: float = 1.0
    unit: str = ""

    @property
    def residual(self) -> Array:
        """ln(found/expected), or found − expected where the check goes by difference."""
        with np.errstate(all="ignore"):
            if CHECKS[self.check].relative:
                ratio = np.where(self.found == self.expected, 1.0, self.found / self.expected)
                return np.asarray(np.log(ratio), dtype=np.float64)
            return np.asarray(self.found - self.expected, dtype=np.float64)


def cells(*sources: Point | Curve) -> tuple[str, ...]:
    """The cells that a value from these sources depends on: values, temperatures, curves."""
    names: list[str] = []
    for source in sources:
        names.append(source.name)
        if isinstance(source, Point) and not np.isnan(source.temperature):
            names.append(source.name + TEMPERATURE)
    return tuple(names)


def relative_spread(source: Point | Curve) -> float:
    """Own uncertainty of a point as a share of its value; 0 for a curve, which states none.

    A value stated to be further off than ``LEAST_CERTAIN`` is rather wrong itself.
    """
    if not (isinstance(source, Point) and source.value):
        return 0.0
    return min(source.spread / abs(source.value), LEAST_CERTAIN)
