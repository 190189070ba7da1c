"""The one registry of quantities: what each is called, measured in, bounded by and defined as."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType


@dataclass(frozen=True, slots=True)
class Quantity:
    """One quantity of the handbook.

    ``unit`` holds in tables, code, pages and exports; ``low`` and ``high`` are bounds no liquid
    leaves, in that unit. ``kind`` is ``measured`` (may stand in the tables) or ``derived``.
    ``needs_temperature`` says that a value means nothing without its temperature. ``formula`` is
    LaTeX; ``validity`` and ``source`` are shown on the methods page.
    """

    key: str
    name: str
    symbol: str
    unit: str
    decimals: int
    low: float
    high: float
    kind: str
    needs_temperature: bool
    formula: str
    definition: str
    validity: str
    source: str


def _measured(
    key: str,
    name: str,
    symbol: str,
    unit: str,
    decimals: int,
    bounds: tuple[float, float],
    definition: str,
    validity: str,
    *,
    needs_temperature: bool,
    source: str = "the measured values, each with its own source",
) -> Quantity:
    low, high = bounds
    return Quantity(
        key, name, symbol, unit, decimals, low, high, "measured", needs_temperature, "",
        definition, validity, source,
    )  # fmt: skip


def _derived(
    key: str,
    name: str,
    symbol: str,
    unit: str,
    decimals: int,
    bounds: tuple[float, float],
    formula: str,
    definition: str,
    validity: str,
    source: str,
    *,
    needs_temperature: bool = True,
) -> Quantity:
    low, high = bounds
    return Quantity(
        key, name, symbol, unit, decimals, low, high, "derived", needs_temperature, formula,
        definition, validity, source,
    )  # fmt: skip


_ALL = (
    _measured(
        "relative_permittivity", "Relative permittivity", "ε", "1", 2, (1.0, 400.0),
        "Static relative permittivity of the pure liquid: how many times more charge a capacitor "
        "stores with the liquid between its plates than with vacuum.",
        "Static limit, below the frequency where the molecules cease to follow the field; "
        "saturation pressure or 1 atm.",
        needs_temperature=True,
    ),
    _measured(
        "refractive_index", "Refractive index", "n_D", "1", 4, (1.0, 2.5),
        "Refractive index of the liquid against air at the sodium D line (589.3 nm).",
        "Sodium D line. Values at other temperatures follow from constant molar refraction.",
        needs_temperature=True,
    ),
    _measured(
        "density", "Density", "ρ", "g/cm3", 4, (0.03, 4.0),
        "Mass of the pure liquid by volume, at 1 atm or at its own vapour pressure.",
        "Liquid range; curves only inside their stated range.",
        needs_temperature=True,
    ),
    _measured(
        "dipole_moment", "Dipole moment", "μ", "D", 2, (0.0, 15.0),
        "Permanent electric dipole moment of the free molecule (gas phase unless the note of the "
        "value says otherwise).",
        "A property of the molecule: a moment measured in solution differs by up to some 10 %.",
        needs_temperature=False,
    ),
    _measured(
        "melting_point", "Melting point", "t_m", "degC", 1, (-273.15, 600.0),
        "Temperature at which solid and liquid are in equilibrium at 1 atm.",
        "Lower end of the liquid range used everywhere in the handbook.",
        needs_temperature=False,
    ),
    _measured(
        "boiling_point", "Boiling point", "t_b", "degC", 1, (-273.15, 750.0),
        "Temperature at which the vapour pressure reaches 1 atm (101.325 kPa).",
        "Upper end of the liquid range used everywhere in the handbook.",
        needs_temperature=False,
    ),
    _measured(
        "flash_point", "Flash point", "t_f", "degC", 0, (-120.0, 400.0),
        "Lowest temperature at which vapour over the liquid can be lit; closed cup unless the "
        "method says otherwise.",
        "Depends on the apparatus. The supplier's safety data sheet comes first.",
        needs_temperature=False,
    ),
    _measured(
        "conductivity", "Electrical conductivity", "κ", "S/m", 12, (1e-19, 100.0),
        "Electrical conductivity of the pure liquid.",
        "Traces of water or salts raise it by orders of magnitude: an order of magnitude only.",
        needs_temperature=True,
    ),
    _measured(
        "viscosity", "Dynamic viscosity", "η", "mPa s", 3, (0.001, 1e9),
        "Dynamic (shear) viscosity of the liquid.",
        "Newtonian liquid; curves only inside their stated range.",
        needs_temperature=True,
    ),
    _measured(
        "vapour_pressure", "Vapour pressure", "p", "kPa", 3, (0.0, 200_000.0),
        "Pressure of the vapour in equilibrium with the liquid.",
        "Curves only inside their stated range.",
        needs_temperature=True,
    ),
    _derived(
        "molar_mass", "Molar mass", "M", "g/mol", 3, (2.0, 2000.0),
        r"M = \sum_i N_i A_{\mathrm{r},i}\,M_\mathrm{u}",
        "Sum of the standard atomic weights over the molecular formula.",
        "Natural isotopic composition.",
        "IUPAC standard atomic weights (Prohaska et al., Pure Appl. Chem. 94, 573, 2022)",
        needs_temperature=False,
    ),
    _derived(
        "kirkwood_function", "Kirkwood function", "f(ε)", "1", 4, (0.0, 0.5),
        r"f(\varepsilon) = \frac{\varepsilon-1}{2\varepsilon+1}",
        "Strength of the reaction field that a dipole feels from the liquid around it: 0 for "
        "vacuum, 0.5 for a conductor.",
        "Continuum picture: the liquid has no structure of its own.",
        "Kirkwood, J. Chem. Phys. 2, 351 (1934); Onsager, J. Am. Chem. Soc. 58, 1486 (1936)",
    ),
    _derived(
        "clausius_mossotti_function", "Clausius–Mossotti function", "L(ε)", "1", 4, (0.0, 1.0),
        r"L(\varepsilon) = \frac{\varepsilon-1}{\varepsilon+2}",
        "Polarization by volume in the local field of Lorentz.",
        "Exact for unpolar liquids of low density; for polar liquids a formal number.",
        "Mossotti (1850); Clausius, Die mechanische Wärmetheorie II (1879)",
    ),
    _derived(
        "molar_volume", "Molar volume", "V", "cm3/mol", 2, (5.0, 2000.0),
        r"V = \frac{M}{\rho}",
        "Volume of one mole of the liquid.",
        "Wherever the density is known.",
        "definition",
    ),
    _derived(
        "thermal_expansivity", "Thermal expansivity", "α", "1/K", 6, (-0.001, 0.02),
        r"\alpha = -\frac{1}{\rho}\frac{\mathrm{d}\rho}{\mathrm{d}T}",
        "Relative growth of the volume by temperature.",
        "Inside the range of a density curve, or from densities at two temperatures or more.",
        "definition",
    ),
    _derived(
        "molar_polarization", "Molar polarization", "P", "cm3/mol", 2, (0.0, 2000.0),
        r"P = V\,\frac{\varepsilon-1}{\varepsilon+2}",
        "Polarization that one mole of the liquid contributes in the Lorentz field.",
        "Additive for unpolar liquids; for polar liquids a formal number.",
        "Clausius (1879); Mossotti (1850)",
    ),
    _derived(
        "molar_refraction", "Molar refraction", "R", "cm3/mol", 2, (0.0, 500.0),
        r"R = V\,\frac{n_\mathrm{D}^2-1}{n_\mathrm{D}^2+2}",
        "Polarization of the electrons of one mole, nearly the same at every temperature.",
        "Sodium D line; changes by less than about 1 % over the liquid range.",
        "Lorentz, Ann. Phys. 9, 641 (1880); Lorenz, Ann. Phys. 11, 70 (1880)",
    ),
    _derived(
        "orientation_polarization", "Orientation polarization", "P_or", "cm3/mol", 2,
        (-100.0, 2000.0),
        r"P_\mathrm{or} = P - 1.05\,R",
        "What is left of the molar polarization when electrons and atoms are taken away: the part "
        "due to turning dipoles.",
        "The atomic polarization is taken as 5 % of the refraction, an assumption; a small "
        "negative number means none within that assumption.",
        "Debye, Phys. Z. 13, 97 (1912); the 5 % is customary",
    ),
    _derived(
        "debye_dipole_moment", "Dipole moment after Debye", "μ_D", "D", 2, (0.0, 15.0),
        r"P - 1.05\,R = \frac{N_\mathrm{A}\,\mu_\mathrm{D}^2}{9\,\varepsilon_0\,k\,T}",
        "Apparent dipole moment when the liquid is treated as a gas of dipoles.",
        "Apparent only: too small in every polar liquid, since the Lorentz field is not the field "
        "on a dipole; not valid for associated liquids.",
        "Debye, Phys. Z. 13, 97 (1912)",
    ),
    _derived(
        "onsager_dipole_moment", "Dipole moment after Onsager", "μ_O", "D", 2, (0.0, 30.0),
        r"\frac{(\varepsilon-\varepsilon_\infty)(2\varepsilon+\varepsilon_\infty)}"
        r"{\varepsilon(\varepsilon_\infty+2)^2}"
        r" = \frac{N_\mathrm{A}\,\mu_\mathrm{O}^2}{9\,\varepsilon_0\,k\,T\,V},"
        r"\qquad \varepsilon_\infty = 1.05\,n_\mathrm{D}^2",
        "Dipole moment of the molecule that explains the permittivity when neighbours turn "
        "independently of each other.",
        "Within about 10 % for aprotic liquids; association shows as a difference from the gas.",
        "Onsager, J. Am. Chem. Soc. 58, 1486 (1936)",
    ),
    _derived(
        "kirkwood_correlation_factor", "Kirkwood correlation factor", "g", "1", 2, (0.0, 20.0),
        r"g = \left(\frac{\mu_\mathrm{O}}{\mu}\right)^2",
        "How neighbouring dipoles stand to each other: above 1 parallel, below 1 opposed.",
        "None where the gas-phase moment is zero within its uncertainty.",
        "Kirkwood, J. Chem. Phys. 7, 911 (1939); Fröhlich, Theory of Dielectrics (1949)",
    ),
    _derived(
        "lippert_mataga_polarizability", "Orientation polarizability", "Δf", "1", 4, (-0.1, 0.5),
        r"\Delta f = \frac{\varepsilon-1}{2\varepsilon+1}"
        r"-\frac{n_\mathrm{D}^2-1}{2n_\mathrm{D}^2+1}",
        "Part of the reaction field that follows slowly, by turning molecules; it sets the shift "
        "of fluorescence with solvent polarity.",
        "Continuum picture; hydrogen bonds to the dye are not in it.",
        "Lippert, Z. Naturforsch. A 10, 541 (1955); Mataga, Kaifu and Koizumi, "
        "Bull. Chem. Soc. Jpn. 29, 465 (1956)",
    ),
    _derived(
        "temperature_coefficient", "Temperature coefficient of the permittivity", "dε/dT", "1/K",
        4, (-20.0, 20.0),
        r"\frac{\mathrm{d}\varepsilon}{\mathrm{d}T}",
        "Slope of the permittivity by temperature, with its sign: falls, rises, no trend within "
        "its uncertainty, or not known.",
        "From a curve inside its range, or a weighted straight line through two temperatures or "
        "more; the sign holds with 95 % confidence.",
        "definition",
    ),
    _derived(
        "expected_temperature_coefficient", "Expected temperature coefficient", "(dε/dT)_g",
        "1/K", 4, (-20.0, 20.0),
        r"\left(\frac{\mathrm{d}\varepsilon}{\mathrm{d}T}\right)_g ="
        r" \frac{\mathrm{d}}{\mathrm{d}T}\;\varepsilon(V(T), T)\quad\text{at constant } g\mu^2",
        "Slope that thermal expansion and thermal agitation alone would give, at a constant "
        "correlation factor; for an unpolar liquid −α(ε−1)(ε+2)/3.",
        "What the observed slope has beyond it is change of association.",
        "Fröhlich, Theory of Dielectrics (1949), differentiated by the handbook",
    ),
    _derived(
        "bjerrum_length", "Bjerrum length", "l_B", "nm", 2, (0.1, 70.0),
        r"l_\mathrm{B} = \frac{e^2}{4\pi\varepsilon_0\,\varepsilon\,k\,T}",
        "Distance at which two unit charges attract each other with the thermal energy kT: below "
        "about 1 nm salts come apart, above about 3 nm they pair.",
        "Continuum picture.",
        "Bjerrum, Kgl. Danske Vidensk. Selsk. Mat.-fys. Medd. 7, no. 9 (1926)",
    ),
    _derived(
        "born_solvation_energy", "Born solvation energy", "ΔG_B", "kJ/mol", 1, (-400.0, 0.0),
        r"\Delta G_\mathrm{B} = -\frac{N_\mathrm{A}e^2}{8\pi\varepsilon_0\,r}"
        r"\left(1-\frac{1}{\varepsilon}\right),\qquad r = 0.2\ \mathrm{nm}",
        "Free energy of carrying a unit charge of 0.2 nm radius from vacuum into the liquid.",
        "Continuum picture with one fixed radius: for comparing liquids, not for one ion.",
        "Born, Z. Phys. 1, 45 (1920)",
    ),
    _derived(
        "debye_length_01", "Debye length at 0.1 mol/dm³", "λ_D(0.1)", "nm", 3, (0.0, 50.0),
        r"\lambda_\mathrm{D} = \sqrt{\frac{\varepsilon_0\,\varepsilon\,k\,T}"
        r"{2 N_\mathrm{A} e^2 c}},\qquad c = 0.1\ \mathrm{mol\,dm^{-3}}",
        "Reach of a charge in a 0.1 mol/dm³ solution of a 1:1 salt.",
        "As if the salt were dissolved and wholly ionised, which unpolar liquids do not do.",
        "Debye and Hückel, Phys. Z. 24, 185 (1923)",
    ),
    _derived(
        "debye_length_001", "Debye length at 0.01 mol/dm³", "λ_D(0.01)", "nm", 3, (0.0, 50.0),
        r"\lambda_\mathrm{D} = \sqrt{\frac{\varepsilon_0\,\varepsilon\,k\,T}"
        r"{2 N_\mathrm{A} e^2 c}},\qquad c = 0.01\ \mathrm{mol\,dm^{-3}}",
        "Reach of a charge in a 0.01 mol/dm³ solution of a 1:1 salt.",
        "As if the salt were dissolved and wholly ionised, which unpolar liquids do not do.",
        "Debye and Hückel, Phys. Z. 24, 185 (1923)",
    ),
    _derived(
        "charge_relaxation_time", "Charge relaxation time", "τ", "s", 12, (0.0, 1e10),
        r"\tau = \frac{\varepsilon_0\,\varepsilon}{\kappa}",
        "Time in which a charge on the liquid falls to 1/e: long times mean that the liquid "
        "charges up when it is poured or pumped.",
        "Only where the conductivity was measured; ohmic relaxation, pure liquid.",
        "Maxwell, A Treatise on Electricity and Magnetism (1873)",
    ),
)  # fmt: skip

QUANTITIES: Mapping[str, Quantity] = MappingProxyType({q.key: q for q in _ALL})
MEASURED: tuple[str, ...] = tuple(q.key for q in _ALL if q.kind == "measured")
DERIVED: tuple[str, ...] = tuple(q.key for q in _ALL if q.kind == "derived")
