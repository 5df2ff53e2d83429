"""Records of what light does with a dye: spectrum, colour, polarised light, emission, redox, transfer, medium.

Each follows from the computed states and the calibrated band. A number with ``_low`` and ``_high`` beside it is a
median with a central interval of probability ``coverage``, carried over from the interval of the band.
"""

from __future__ import annotations

from typing import Annotated, ClassVar

from pydantic import Field

from .arrays import FloatArray, IntArray, Shape
from .base import Frozen, Quantity, QuantityInfo, Record


class Spread(Frozen):
    """A number with a central interval of probability ``coverage``."""

    value: float
    low: float
    high: float
    coverage: float = 0.9

    def quantity(self, name: str, unit: str) -> Quantity:
        """The number as briefs see it."""
        return Quantity(name=name, value=self.value, unit=unit, low=self.low, high=self.high, coverage=self.coverage)


class Spectrum(Record):
    """Absorption spectrum of all states in one medium, and what a layer of the dye takes out of a light.

    The reported band has the calibrated position, molar absorptivity and width. The other states are moved by the
    same correction in eV, have the same width, and a height in proportion to their oscillator strength.
    """

    kind = "spectrum"
    wavelength_nm: Annotated[FloatArray, Shape("points")]
    molar_absorptivity: Annotated[FloatArray, Shape("points")] = Field(description="M^-1 cm^-1")
    band_energy_ev: Annotated[FloatArray, Shape("states")]
    band_absorptivity: Annotated[FloatArray, Shape("states")] = Field(description="M^-1 cm^-1, each band alone")
    band_width_ev: float = Field(description="full width at half maximum of every band")
    band_strength: float = Field(description="oscillator strength of the reported band by its calibrated area")
    concentration_m: float
    path_cm: float
    line_nm: float
    line_width_nm: float
    line_absorptivity: Spread
    line_absorbance: Spread
    line_absorptance_percent: Spread
    sunlight_absorptance_percent: Spread
    sunlight_current_ma_cm2: Spread
    light_harvesting_efficiency: Spread

    offers: ClassVar[tuple[QuantityInfo, ...]] = (
        QuantityInfo(name="line_absorptivity", unit="M^-1 cm^-1", meaning="molar absorptivity at the line of the lamp"),
        QuantityInfo(name="line_absorbance", unit="1", meaning="decadic absorbance of the layer at that line"),
        QuantityInfo(name="line_absorptance_percent", unit="%", meaning="share of that light the layer absorbs"),
        QuantityInfo(
            name="sunlight_absorptance_percent", unit="%", meaning="share of the photons of AM1.5G the layer absorbs"
        ),
        QuantityInfo(
            name="sunlight_current_ma_cm2", unit="mA/cm^2", meaning="current if each of them gave one electron"
        ),
        QuantityInfo(name="light_harvesting_efficiency", unit="1", meaning="1 - 10^-f of the reported band"),
        QuantityInfo(name="band_width_ev", unit="eV", meaning="full width of the band at half maximum"),
    )

    def quantities(self) -> tuple[Quantity, ...]:
        """The numbers listed in ``offers``."""
        spreads = [info for info in self.offers if info.name != "band_width_ev"]
        made = [getattr(self, info.name).quantity(info.name, info.unit) for info in spreads]
        return (*made, Quantity(name="band_width_ev", value=self.band_width_ev, unit="eV"))


class Colour(Record):
    """Colour of the layer in transmitted light: CIE 1976 L*a*b* and sRGB, relative to the clear medium."""

    kind = "colour"
    illuminant: str
    observer: str
    lightness: Spread
    a: Spread
    b: Spread
    chroma: float
    hue_deg: float = Field(description="hue angle h_ab, 0 to 360")
    srgb: str = Field(description="#rrggbb, held inside the gamut")
    in_gamut: bool

    offers: ClassVar[tuple[QuantityInfo, ...]] = (
        QuantityInfo(name="colour_lightness", unit="1", meaning="CIE L* of the layer, 0 black to 100 clear"),
        QuantityInfo(name="colour_a", unit="1", meaning="CIE a*: green below zero, red above"),
        QuantityInfo(name="colour_b", unit="1", meaning="CIE b*: blue below zero, yellow above"),
        QuantityInfo(name="colour_chroma", unit="1", meaning="CIE C*, 0 for grey"),
        QuantityInfo(name="colour_hue_deg", unit="degree", meaning="CIE hue angle: red 0, yellow 90, green 180"),
    )

    def quantities(self) -> tuple[Quantity, ...]:
        """The numbers listed in ``offers``."""
        return (
            self.lightness.quantity("colour_lightness", "1"),
            self.a.quantity("colour_a", "1"),
            self.b.quantity("colour_b", "1"),
            Quantity(name="colour_chroma", value=self.chroma, unit="1"),
            Quantity(name="colour_hue_deg", value=self.hue_deg, unit="degree"),
        )


class Orientation(Record):
    """Transition dipoles in the axes of the molecule, and polarised light on it, rigid and in a uniaxial film.

    The molecular axes are the rows of ``axes``: long (least inertia), short, and normal (most inertia; of a flat
    molecule the normal of its plane). Where all states matter they count with their absorptivity at ``at_nm``.
    """

    kind = "orientation"
    axes: Annotated[FloatArray, Shape(3, 3)] = Field(description="rows, in the frame of the geometry")
    half_lengths_angstrom: Annotated[FloatArray, Shape(3)] = Field(description="of the molecule along its axes")
    transition_axes_deg: Annotated[FloatArray, Shape("states", 3)] = Field(
        description="angle of each transition dipole to the long, short and normal axis, 0 to 90"
    )
    to_reported_deg: Annotated[FloatArray, Shape("states")] = Field(
        description="angle of each transition dipole to that of the reported band, 0 to 90"
    )
    plane_angle_deg: float = Field(description="angle of the reported dipole out of the plane of long and short axis")
    at_nm: float
    absorption_tensor: Annotated[FloatArray, Shape(3, 3)] = Field(
        description="sum of u u^T over states in the molecular axes, weighted by absorptivity at at_nm; trace 1"
    )
    axis_orientation_factors: Annotated[FloatArray, Shape(3)] = Field(description="K of the axes in the film; sum 1")
    order_parameter: float = Field(description="Saupe S of the long axis in the film")
    order_from: str = Field(description='"settings" or "shape"')
    orientation_factor: float = Field(description="K = <cos^2> of the absorption at at_nm to the stretch")
    dichroic_ratio: float = Field(description="A parallel over A perpendicular")
    reduced_linear_dichroism: float = Field(description="IUPAC: LD/(3 A_iso), -1/2 to 1")
    reduced_linear_dichroism_norden: float = Field(description="LD/A_iso, three times the IUPAC one")
    state_dichroic_ratio: Annotated[FloatArray, Shape("states")]
    rotation: Annotated[FloatArray, Shape(3, 3)] = Field(description="turns the molecular axes into the host")
    polariser_deg: Annotated[FloatArray, Shape("angles")]
    polariser_absorption: Annotated[FloatArray, Shape("angles")] = Field(
        description="rigid molecule: absorption over that of the isotropic solution"
    )
    polariser_max_deg: float = Field(description="polariser angle of most absorption, 0 to 180")
    polariser_contrast: float = Field(description="(max - min)/(max + min) over polariser angles, 0 to 1")
    excitation_nm: float
    fundamental_anisotropy: float = Field(description="r0 when excited there and emitting from the reported state")
    cautions: tuple[str, ...] = ()

    offers: ClassVar[tuple[QuantityInfo, ...]] = (
        QuantityInfo(name="dichroic_ratio", unit="1", meaning="A parallel over A perpendicular in the uniaxial film"),
        QuantityInfo(name="reduced_linear_dichroism", unit="1", meaning="IUPAC convention, -1/2 to 1"),
        QuantityInfo(name="order_parameter", unit="1", meaning="Saupe S of the long axis in the film"),
        QuantityInfo(name="polariser_contrast", unit="1", meaning="rigid molecule: (max - min)/(max + min)"),
        QuantityInfo(name="polariser_max_deg", unit="degree", meaning="rigid molecule: polariser angle of most light"),
        QuantityInfo(name="plane_angle_deg", unit="degree", meaning="transition dipole out of the molecular plane"),
        QuantityInfo(name="fundamental_anisotropy", unit="1", meaning="limit of the fluorescence anisotropy, r0"),
    )

    def quantities(self) -> tuple[Quantity, ...]:
        """The numbers listed in ``offers``."""
        return tuple(Quantity(name=info.name, value=getattr(self, info.name), unit=info.unit) for info in self.offers)


class Emission(Record):
    """What comes back out of the reported state: emission band, rates, and the cross-section that a laser uses.

    The emission band is a Gaussian in energy with the width of the absorption band (mirror image), in photons.
    """

    kind = "emission"
    wavelength_nm: Annotated[FloatArray, Shape("points")]
    photons_per_nm: Annotated[FloatArray, Shape("points")] = Field(description="area one")
    stimulated_emission_cm2: Annotated[FloatArray, Shape("points")] = Field(description="cross-section")
    refractive_index: float
    radiative_rate_per_s: Spread = Field(description="Strickler-Berg from the calibrated absorption band, with n^2")
    radiative_lifetime_ns: Spread
    dipole_rate_per_s: float = Field(description="Einstein A of the computed transition dipole, with n")
    einstein_b_m3_per_j_s2: float = Field(description="stimulated emission, spectral energy density per frequency")
    stimulated_cross_section_cm2: Spread = Field(description="largest")
    zero_zero_ev: float = Field(description="midway between absorption and emission maximum")
    stokes_shift_cm1: float
    dark_below_ev: float = Field(description="how far the lowest computed state lies below the reported one")
    cautions: tuple[str, ...] = ()

    offers: ClassVar[tuple[QuantityInfo, ...]] = (
        QuantityInfo(name="radiative_rate_per_s", unit="s^-1", meaning="rate of spontaneous emission"),
        QuantityInfo(name="radiative_lifetime_ns", unit="ns", meaning="lifetime if nothing but emission happened"),
        QuantityInfo(
            name="stimulated_cross_section_cm2", unit="cm^2", meaning="largest cross-section of stimulated emission"
        ),
        QuantityInfo(name="zero_zero_ev", unit="eV", meaning="energy of the excited singlet, 0-0"),
        QuantityInfo(name="stokes_shift_cm1", unit="cm^-1", meaning="absorption maximum minus emission maximum"),
    )

    def quantities(self) -> tuple[Quantity, ...]:
        """The numbers listed in ``offers``."""
        return (
            self.radiative_rate_per_s.quantity("radiative_rate_per_s", "s^-1"),
            self.radiative_lifetime_ns.quantity("radiative_lifetime_ns", "ns"),
            self.stimulated_cross_section_cm2.quantity("stimulated_cross_section_cm2", "cm^2"),
            Quantity(name="zero_zero_ev", value=self.zero_zero_ev, unit="eV"),
            Quantity(name="stokes_shift_cm1", value=self.stokes_shift_cm1, unit="cm^-1"),
        )


class Redox(Record):
    """One-electron potentials of ground and excited state, estimated from orbital levels, against ``reference``."""

    kind = "redox"
    reference: str
    oxidation_potential_v: Spread = Field(description="dye+/dye")
    reduction_potential_v: Spread = Field(description="dye/dye-")
    excited_oxidation_potential_v: Spread = Field(description="dye+/dye*: how strongly the excited dye reduces")
    excited_reduction_potential_v: Spread = Field(description="dye*/dye-: how strongly the excited dye oxidises")
    cautions: tuple[str, ...] = ()

    offers: ClassVar[tuple[QuantityInfo, ...]] = (
        QuantityInfo(name="oxidation_potential_v", unit="V", meaning="dye+/dye against the reference electrode"),
        QuantityInfo(name="reduction_potential_v", unit="V", meaning="dye/dye-"),
        QuantityInfo(name="excited_oxidation_potential_v", unit="V", meaning="dye+/dye*, the excited dye as reductant"),
        QuantityInfo(name="excited_reduction_potential_v", unit="V", meaning="dye*/dye-, the excited dye as oxidant"),
    )

    def quantities(self) -> tuple[Quantity, ...]:
        """The numbers listed in ``offers``."""
        return tuple(getattr(self, info.name).quantity(info.name, info.unit) for info in self.offers)


class Transfer(Record):
    """Foerster transfer to or from the partner of the settings; the dye itself where there is none."""

    kind = "transfer"
    donor: str
    acceptor: str
    overlap_m_cm_nm4: Spread = Field(description="spectral overlap J, M^-1 cm^-1 nm^4")
    foerster_radius_angstrom: Spread
    quantum_yield: float
    kappa2: float
    refractive_index: float

    offers: ClassVar[tuple[QuantityInfo, ...]] = (
        QuantityInfo(
            name="foerster_radius_angstrom", unit="angstrom", meaning="distance at which half the excitations go over"
        ),
    )

    def quantities(self) -> tuple[Quantity, ...]:
        """The radius."""
        return (self.foerster_radius_angstrom.quantity("foerster_radius_angstrom", "angstrom"),)


class Partners(Record):
    """The best acceptors of the library for one donor, best first; candidates by their id in the store."""

    kind = "partners"
    acceptor: Annotated[IntArray, Shape("partners", number="int")]
    foerster_radius_angstrom: Annotated[FloatArray, Shape("partners")]
    quantum_yield: float
    kappa2: float
    refractive_index: float


class Solvatochromism(Record):
    """How the band moves with the polarity of the medium, from the dipoles of both states in Onsager's sphere.

    Shifts are those of wavenumbers: negative is to the red.
    """

    kind = "solvatochromism"
    radius_angstrom: float
    ground_dipole_debye: float
    excited_dipole_debye: float
    dipole_change_debye: float
    absorption_slope_cm1: float = Field(description="absorption maximum against Lippert-Mataga Delta f")
    emission_slope_cm1: float
    stokes_slope_cm1: float = Field(description="Stokes shift against Delta f, Lippert-Mataga")
    stokes_slope_etn_cm1: float = Field(description="Stokes shift against ETN, Ravi and others 1994")
    from_medium: str
    to_medium: str
    solvent_shift_cm1: float = Field(description="absorption between the two media, McRae")
    solvent_shift_nm: float
    cautions: tuple[str, ...] = ()

    offers: ClassVar[tuple[QuantityInfo, ...]] = (
        QuantityInfo(name="stokes_slope_cm1", unit="cm^-1", meaning="Stokes shift against Delta f, Lippert-Mataga"),
        QuantityInfo(name="solvent_shift_cm1", unit="cm^-1", meaning="absorption shift between two media, McRae"),
        QuantityInfo(name="solvent_shift_nm", unit="nm", meaning="the same shift in wavelength; positive is red"),
        QuantityInfo(name="excited_dipole_debye", unit="debye", meaning="dipole moment of the excited state"),
    )

    def quantities(self) -> tuple[Quantity, ...]:
        """The numbers listed in ``offers``."""
        return tuple(Quantity(name=info.name, value=getattr(self, info.name), unit=info.unit) for info in self.offers)


class Progression(Record):
    """Vibrational progression of the reported band: displaced harmonic oscillators along the GFN2-xTB modes."""

    kind = "progression"
    wavenumber_cm1: Annotated[FloatArray, Shape("modes")] = Field(description="strongest coupling first")
    huang_rhys: Annotated[FloatArray, Shape("modes")]
    total_huang_rhys: float
    reorganisation_ev: float = Field(description="sum of Huang-Rhys factor times quantum")
    zero_zero_nm: float = Field(description="0-0 line, with the maximum where the calibrated band has it")
    wavelength_nm: Annotated[FloatArray, Shape("points")]
    molar_absorptivity: Annotated[FloatArray, Shape("points")] = Field(
        description="M^-1 cm^-1, with the area of the calibrated band"
    )
    cautions: tuple[str, ...] = ()

    offers: ClassVar[tuple[QuantityInfo, ...]] = (
        QuantityInfo(name="total_huang_rhys", unit="1", meaning="sum of Huang-Rhys factors; small: a sharp 0-0 line"),
        QuantityInfo(name="reorganisation_ev", unit="eV", meaning="energy the excited dye gives up by relaxing"),
    )

    def quantities(self) -> tuple[Quantity, ...]:
        """The numbers listed in ``offers``."""
        return tuple(Quantity(name=info.name, value=getattr(self, info.name), unit=info.unit) for info in self.offers)


def light_records() -> tuple[type[Record], ...]:
    """The record kinds of this module, in the order they come into being."""
    return (Spectrum, Colour, Orientation, Emission, Redox, Transfer, Partners, Solvatochromism, Progression)
