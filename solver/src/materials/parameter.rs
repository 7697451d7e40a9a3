//! The names of material parameters: one table for scripts, archive and Rust.

use serde::{Deserialize, Serialize};

/// The physical dimension of a material parameter, for units at the border.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub enum Kind {
    /// Energy, J.
    Energy,
    /// A plain number.
    Number,
    /// Number per volume, m^-3.
    Density,
    /// Mobility, m^2 V^-1 s^-1.
    Mobility,
    /// Time, s.
    Time,
    /// Radiative coefficient, m^3 s^-1.
    RadiativeCoefficient,
    /// Auger coefficient, m^6 s^-1.
    AugerCoefficient,
    /// Absorption coefficient, m^-1.
    InverseLength,
    /// Temperature, K.
    Temperature,
    /// Energy over temperature, J/K.
    EnergyPerTemperature,
    /// Number per area, m^-2.
    ArealDensity,
}

macro_rules! parameters {
    ($($variant:ident $key:literal $kind:ident $doc:literal;)*) => {
        /// A parameter of a material that a script may set or override.
        #[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
        pub enum Parameter {
            $(#[doc = $doc] $variant,)*
        }
        impl Parameter {
            /// Every parameter, in the order of the reference page.
            pub const ALL: &'static [Parameter] = &[$(Parameter::$variant,)*];
            /// The word for it in scripts and archives.
            pub fn key(self) -> &'static str {
                match self { $(Parameter::$variant => $key,)* }
            }
            /// Its dimension.
            pub fn kind(self) -> Kind {
                match self { $(Parameter::$variant => Kind::$kind,)* }
            }
            /// One sentence on what it is.
            pub fn description(self) -> &'static str {
                match self { $(Parameter::$variant => $doc,)* }
            }
        }
    };
}

parameters! {
    Gap "gap" Energy "Band gap (the lowest one).";
    Affinity "affinity" Energy "Electron affinity: vacuum level minus conduction-band edge.";
    Permittivity "permittivity" Number "Static relative permittivity.";
    ConductionDensity "nc" Density "Effective density of states of the conduction band.";
    ValenceDensity "nv" Density "Effective density of states of the valence band.";
    ElectronMobility "electron_mobility" Mobility "Low-field mobility of electrons.";
    HoleMobility "hole_mobility" Mobility "Low-field mobility of holes.";
    ElectronLifetime "electron_lifetime" Time "Shockley-Read-Hall lifetime of electrons; infinite switches the channel off.";
    HoleLifetime "hole_lifetime" Time "Shockley-Read-Hall lifetime of holes; infinite switches the channel off.";
    TrapEnergy "trap_energy" Energy "Energy of the recombination level, counted upwards from the intrinsic level.";
    TrapBelowConduction "trap_below_conduction_band" Energy "Energy of the recombination level below the conduction-band edge, instead of `trap_energy`.";
    TrapAboveValence "trap_above_valence_band" Energy "Energy of the recombination level above the valence-band edge, instead of `trap_energy`.";
    RadiativeCoefficient "radiative_coefficient" RadiativeCoefficient "Coefficient B of radiative (band-to-band) recombination.";
    ElectronAuger "electron_auger" AugerCoefficient "Auger coefficient C_n (the energy goes to an electron).";
    HoleAuger "hole_auger" AugerCoefficient "Auger coefficient C_p (the energy goes to a hole).";
    Absorption "absorption" InverseLength "One absorption coefficient; under a spectrum it acts at photon energies above the gap.";
    ElectronLifetimeDoping "electron_lifetime_reference_doping" Density "Doping (donors plus acceptors) at which `electron_lifetime` has fallen to half: it is over 1 + (N / this)^`lifetime_doping_exponent`.";
    HoleLifetimeDoping "hole_lifetime_reference_doping" Density "Doping (donors plus acceptors) at which `hole_lifetime` has fallen to half.";
    LifetimeDopingPower "lifetime_doping_exponent" Number "Exponent of the doping in both lifetimes; 1 unless given.";
    DislocationDensity "dislocation_density" ArealDensity "Threading dislocations, at which carriers recombine besides: each lifetime's reciprocal gains pi^3 D / 4 times this, D the carrier's diffusion coefficient.";
    MinorityElectronMobility "minority_electron_mobility" Mobility "Mobility of electrons where acceptors are the majority, instead of `electron_mobility`; between the two by the share of acceptors.";
    MinorityHoleMobility "minority_hole_mobility" Mobility "Mobility of holes where donors are the majority, instead of `hole_mobility`; between the two by the share of donors.";
    DonorLevel "donor_level" Energy "Depth of the donors below the conduction-band edge: given, they are ionised as far as the electrons' level lets them be.";
    AcceptorLevel "acceptor_level" Energy "Height of the acceptors above the valence-band edge: given, they are ionised as far as the holes' level lets them be.";
    DonorDegeneracy "donor_degeneracy" Number "Degeneracy of the donors' level, 2 unless given.";
    AcceptorDegeneracy "acceptor_degeneracy" Number "Degeneracy of the acceptors' level, 4 unless given.";
    NarrowingCubeRoot "gap_narrowing_cube_root" Energy "Band-gap narrowing at a net doping of 1e18 cm^-3 that grows with its cube root; any of the three stands for the library's coefficients.";
    NarrowingFourthRoot "gap_narrowing_fourth_root" Energy "Band-gap narrowing at a net doping of 1e18 cm^-3 that grows with its fourth root.";
    NarrowingSquareRoot "gap_narrowing_square_root" Energy "Band-gap narrowing at a net doping of 1e18 cm^-3 that grows with its square root.";
    NarrowingShare "gap_narrowing_conduction_share" Number "Share of the narrowing by which the conduction-band edge falls, 0.5 unless given; the valence-band edge rises by the rest.";
    ReferenceTemperature "reference_temperature" Temperature "Temperature that the numbers given hold at, where one of the options below moves them; 300 K unless given.";
    GapAtZero "gap_at_zero_kelvin" Energy "Band gap at 0 K, instead of `gap`, for Varshni's law.";
    VarshniAlpha "gap_varshni_alpha" EnergyPerTemperature "Varshni's alpha: the gap falls as alpha T^2 / (T + beta).";
    VarshniBeta "gap_varshni_beta" Temperature "Varshni's beta.";
    GapSlope "gap_temperature_coefficient" EnergyPerTemperature "Change of the gap with temperature, instead of Varshni's law; negative where the gap narrows.";
    AffinitySlope "affinity_temperature_coefficient" EnergyPerTemperature "Change of the affinity with temperature; without it the affinity holds, and the valence band takes the change of the gap.";
    ElectronMass "electron_mass" Number "Density-of-states mass of electrons over that of the free electron, instead of `nc`, which is then 2 (2 pi m k T / h^2)^(3/2).";
    HoleMass "hole_mass" Number "Density-of-states mass of holes over that of the free electron, instead of `nv`.";
    ConductionDensityPower "nc_temperature_exponent" Number "Power of T / `reference_temperature` in `nc`: 1.5 for parabolic bands.";
    ValenceDensityPower "nv_temperature_exponent" Number "Power of T / `reference_temperature` in `nv`.";
    ElectronMobilityPower "electron_mobility_temperature_exponent" Number "Power of T / `reference_temperature` in `electron_mobility`: -1.5 where acoustic phonons scatter.";
    HoleMobilityPower "hole_mobility_temperature_exponent" Number "Power of T / `reference_temperature` in `hole_mobility`.";
    ElectronLifetimePower "electron_lifetime_temperature_exponent" Number "Power of T / `reference_temperature` in `electron_lifetime`.";
    HoleLifetimePower "hole_lifetime_temperature_exponent" Number "Power of T / `reference_temperature` in `hole_lifetime`.";
    RadiativePower "radiative_coefficient_temperature_exponent" Number "Power of T / `reference_temperature` in `radiative_coefficient`.";
    ElectronAugerPower "electron_auger_temperature_exponent" Number "Power of T / `reference_temperature` in `electron_auger`.";
    HoleAugerPower "hole_auger_temperature_exponent" Number "Power of T / `reference_temperature` in `hole_auger`.";
}

impl Parameter {
    /// The parameter of a script's word, if there is one.
    pub fn from_key(key: &str) -> Option<Parameter> {
        Parameter::ALL.iter().copied().find(|p| p.key() == key)
    }
}
