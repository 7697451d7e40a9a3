//! Alloys of variable composition: GaAsP, and GaInAs, GaInP, AlInP and AlGaInP away from their lattice-matched points.
//!
//! A name that the library also has as a lattice-matched compound is one of these where a composition is given.

use super::super::law::{Linear, Mobility, Valley};
use super::super::record::{Ladder, Minimum, OpticalModel, Origin, Record, Sourced};
use super::binaries::{INAS_DIRECT, INAS_ELECTRONS, INAS_HOLES, INAS_L, INAS_X};
use super::cite;
use super::gaas::{GAAS_DIRECT, GAAS_ELECTRONS, GAAS_HOLES, GAAS_L, GAAS_X};
use super::inp::{GAINAS_ELECTRONS, GAINAS_HOLES, INP_ELECTRONS, INP_HOLES};
use super::phosphides::{
    ALINP_ELECTRONS, ALINP_HOLES, ALP_DIRECT, ALP_X, GAINP_ELECTRONS, GAINP_HOLES, GAP_DIRECT, INP_DIRECT,
    INP_X,
};

static GAP_X: Valley = Valley::Varshni { zero: 2.35, alpha: 5.771e-4, beta: 372.0 };
static GAP_L: Valley = Valley::Varshni { zero: 2.72, alpha: 5.771e-4, beta: 372.0 };
static INP_L: Valley = Valley::Varshni { zero: 2.014, alpha: 3.63e-4, beta: 162.0 };
static ALP_L: Valley = Valley::Varshni { zero: 3.57, alpha: 3.18e-4, beta: 588.0 };

/// Direct and X minima of the lattice-matched ends of AlGaInP.
static GAINP_DIRECT: Valley =
    Valley::Alloy { share: 0.51, first: &GAP_DIRECT, second: &INP_DIRECT, bowing: 0.65 };
static GAINP_X: Valley = Valley::Alloy { share: 0.51, first: &GAP_X, second: &INP_X, bowing: 0.2 };
static GAINP_L: Valley = Valley::Alloy { share: 0.51, first: &GAP_L, second: &INP_L, bowing: 1.03 };
static ALINP_DIRECT: Valley =
    Valley::Alloy { share: 0.52, first: &ALP_DIRECT, second: &INP_DIRECT, bowing: -0.48 };
static ALINP_X: Valley = Valley::Alloy { share: 0.52, first: &ALP_X, second: &INP_X, bowing: 0.38 };
static ALINP_L: Valley = Valley::Alloy { share: 0.52, first: &ALP_L, second: &INP_L, bowing: 0.0 };

static GAP_ELECTRONS: Mobility = Mobility::CaugheyThomas {
    low: 10.0,
    high: 152.0,
    reference: 4.4e18,
    power: 0.80,
    lattice: 1.60,
    doping: 0.71,
};
static GAP_HOLES: Mobility = Mobility::CaugheyThomas {
    low: 10.0,
    high: 147.0,
    reference: 1e18,
    power: 0.85,
    lattice: 1.98,
    doping: 0.0,
};

const AUGER_AS_GAAS: Sourced<f64> = Sourced {
    law: 1e-42,
    temperature: (250.0, 350.0),
    origin: Origin::Illustrative,
    source: cite::AUGER_AS_GAAS,
};
const RADIATIVE: Sourced<f64> = Sourced {
    law: 1e-16,
    temperature: (250.0, 350.0),
    origin: Origin::Illustrative,
    source: "order of magnitude 1e-10 cm^3/s of a direct gap, no source, times the share of the electrons in the direct valley",
};
/// Mobilities between materials that have a law.
const fn between(anchors: &'static [(f64, &'static Mobility)], source: &'static str) -> Sourced<Mobility> {
    Sourced {
        law: Mobility::Between(anchors),
        temperature: (200.0, 400.0),
        origin: Origin::Illustrative,
        source,
    }
}
const MASSES: Sourced<()> = Sourced {
    law: (),
    temperature: (20.0, 600.0),
    origin: Origin::SecondHand,
    source: "linear in x between the compounds, all minima of a kind together (that of L in AlP as in GaP), the direct one of GaInP and AlInP \
        through the library's lattice-matched alloy; I. Vurgaftman et al., J. Appl. Phys. 89, 5815 (2001), through a collection of its \
        numbers. The three add up, each weighted by exp of its height above the lowest over kT",
};
const PERMITTIVITY: &str =
    "linear in x between the compounds: GaAs 12.9, InP 12.5, GaP 11.1, InAs 15.15, AlP 9.8, from memory";

pub(crate) static GAASP: Record = Record {
    name: "GaAsP",
    description: "gallium arsenide phosphide GaAs(1-x)P(x), direct below x = 0.47, indirect (X) above",
    composition: Some((0.0, 1.0)),
    minima: Sourced {
        law: &[
            Minimum {
                valley: Valley::Bowed { at_zero: &GAAS_DIRECT, at_one: &GAP_DIRECT, bowing: 0.19 },
                mass: Linear(0.067, 0.063),
            },
            Minimum {
                valley: Valley::Bowed { at_zero: &GAAS_X, at_one: &GAP_X, bowing: 0.24 },
                mass: Linear(0.85, 0.198),
            },
            Minimum {
                valley: Valley::Bowed { at_zero: &GAAS_L, at_one: &GAP_L, bowing: 0.16 },
                mass: Linear(0.56, 0.196),
            },
        ],
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::ALLOY,
    },
    electron_mass: MASSES,
    hole_mass: Sourced {
        law: Linear(0.47, 0.059),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::SPHERE,
    },
    ladder: Sourced {
        law: Ladder::Between { at_zero: 0.0, at_one: 0.47, bowing: 0.0 },
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::ALLOY,
    },
    permittivity: Sourced {
        law: Linear(12.9, -1.8),
        temperature: (77.0, 400.0),
        origin: Origin::FromMemory,
        source: PERMITTIVITY,
    },
    electron_mobility: between(
        &[(0.0, &GAAS_ELECTRONS), (1.0, &GAP_ELECTRONS)],
        "logarithm linear in x between the library's GaAs and GaP (coefficients of M. Sotoodeh, A. H. Khalid and A. A. Rezazadeh, J. Appl. \
         Phys. 87, 2890 (2000), from memory): a stated model that knows no scattering by the alloy",
    ),
    hole_mobility: between(
        &[(0.0, &GAAS_HOLES), (1.0, &GAP_HOLES)],
        "logarithm linear in x between the library's GaAs and GaP (coefficients of M. Sotoodeh, A. H. Khalid and A. A. Rezazadeh, J. Appl. \
         Phys. 87, 2890 (2000), from memory): a stated model that knows no scattering by the alloy",
    ),
    radiative: RADIATIVE,
    electron_auger: AUGER_AS_GAAS,
    hole_auger: AUGER_AS_GAAS,
    electron_lifetime: 1e-9,
    hole_lifetime: 1e-9,
    optics: OpticalModel::None,
};

pub(crate) static GAINAS_X: Record = Record {
    name: "GaInAs",
    description: "gallium indium arsenide Ga(x)In(1-x)As of any composition; without x the one matched to InP",
    composition: Some((0.0, 1.0)),
    minima: Sourced {
        law: &[
            Minimum {
                valley: Valley::Bowed { at_zero: &INAS_DIRECT, at_one: &GAAS_DIRECT, bowing: 0.477 },
                mass: Linear(0.026, 0.041),
            },
            Minimum {
                valley: Valley::Bowed { at_zero: &INAS_X, at_one: &GAAS_X, bowing: 1.4 },
                mass: Linear(0.64, 0.21),
            },
            Minimum {
                valley: Valley::Bowed { at_zero: &INAS_L, at_one: &GAAS_L, bowing: 0.33 },
                mass: Linear(0.29, 0.27),
            },
        ],
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::ALLOY,
    },
    electron_mass: MASSES,
    hole_mass: Sourced {
        law: Linear(0.455, 0.015),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: "the straight line through the library's GaAs (0.47 m0) and Ga(0.47)In(0.53)As (0.462 m0)",
    },
    ladder: Sourced {
        law: Ladder::Between { at_zero: -0.21, at_one: 0.0, bowing: -0.38 },
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::ALLOY,
    },
    permittivity: Sourced {
        law: Linear(15.15, -2.25),
        temperature: (77.0, 400.0),
        origin: Origin::FromMemory,
        source: PERMITTIVITY,
    },
    electron_mobility: between(
        &[(0.0, &INAS_ELECTRONS), (0.47, &GAINAS_ELECTRONS), (1.0, &GAAS_ELECTRONS)],
        "logarithm linear in x between the library's InAs, Ga(0.47)In(0.53)As and GaAs: a stated model",
    ),
    hole_mobility: between(
        &[(0.0, &INAS_HOLES), (0.47, &GAINAS_HOLES), (1.0, &GAAS_HOLES)],
        "logarithm linear in x between the library's InAs, Ga(0.47)In(0.53)As and GaAs: a stated model",
    ),
    radiative: RADIATIVE,
    electron_auger: Sourced {
        law: 7e-41,
        temperature: (250.0, 350.0),
        origin: Origin::Illustrative,
        source: "7e-29 cm^6/s of Ga(0.47)In(0.53)As (NSM archive), kept at every composition: it falls fast with the gap",
    },
    hole_auger: Sourced {
        law: 7e-41,
        temperature: (250.0, 350.0),
        origin: Origin::Illustrative,
        source: "7e-29 cm^6/s of Ga(0.47)In(0.53)As (NSM archive), kept at every composition: it falls fast with the gap",
    },
    electron_lifetime: 10e-9,
    hole_lifetime: 10e-9,
    optics: OpticalModel::GaInAs,
};

pub(crate) static GAINP_X_RECORD: Record = Record {
    name: "GaInP",
    description: "gallium indium phosphide Ga(x)In(1-x)P of any composition, disordered; direct below x = 0.70; without x the one matched \
        to GaAs",
    composition: Some((0.0, 1.0)),
    minima: Sourced {
        law: &[
            Minimum {
                valley: Valley::Bowed { at_zero: &INP_DIRECT, at_one: &GAP_DIRECT, bowing: 0.65 },
                mass: Linear(0.0795, 0.01667),
            },
            Minimum {
                valley: Valley::Bowed { at_zero: &INP_X, at_one: &GAP_X, bowing: 0.2 },
                mass: Linear(0.88, 0.168),
            },
            Minimum {
                valley: Valley::Bowed { at_zero: &INP_L, at_one: &GAP_L, bowing: 1.03 },
                mass: Linear(0.47, 0.286),
            },
        ],
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::ALLOY,
    },
    electron_mass: MASSES,
    hole_mass: Sourced {
        law: Linear(0.6226, 0.216),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: "the straight line through the library's InP (0.6226 m0) and Ga(0.51)In(0.49)P (0.733 m0)",
    },
    ladder: Sourced {
        law: Ladder::Between { at_zero: 0.14, at_one: 0.47, bowing: 0.0 },
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::ALLOY,
    },
    permittivity: Sourced {
        law: Linear(12.5, -1.4),
        temperature: (77.0, 400.0),
        origin: Origin::FromMemory,
        source: PERMITTIVITY,
    },
    electron_mobility: between(
        &[(0.0, &INP_ELECTRONS), (0.51, &GAINP_ELECTRONS), (1.0, &GAP_ELECTRONS)],
        "logarithm linear in x between the library's InP, Ga(0.51)In(0.49)P and GaP: a stated model",
    ),
    hole_mobility: between(
        &[(0.0, &INP_HOLES), (0.51, &GAINP_HOLES), (1.0, &GAP_HOLES)],
        "logarithm linear in x between the library's InP, Ga(0.51)In(0.49)P and GaP: a stated model",
    ),
    radiative: RADIATIVE,
    electron_auger: AUGER_AS_GAAS,
    hole_auger: AUGER_AS_GAAS,
    electron_lifetime: 10e-9,
    hole_lifetime: 10e-9,
    optics: OpticalModel::Phosphide,
};

pub(crate) static ALINP_X_RECORD: Record = Record {
    name: "AlInP",
    description: "aluminium indium phosphide Al(x)In(1-x)P of any composition; direct below x = 0.36; without x the one matched to GaAs",
    composition: Some((0.0, 1.0)),
    minima: Sourced {
        law: &[
            Minimum {
                valley: Valley::Bowed { at_zero: &INP_DIRECT, at_one: &ALP_DIRECT, bowing: -0.48 },
                mass: Linear(0.0795, 0.1413),
            },
            Minimum {
                valley: Valley::Bowed { at_zero: &INP_X, at_one: &ALP_X, bowing: 0.38 },
                mass: Linear(0.88, -0.046),
            },
            Minimum {
                valley: Valley::Bowed { at_zero: &INP_L, at_one: &ALP_L, bowing: 0.0 },
                mass: Linear(0.47, 0.286),
            },
        ],
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: "alloy of the binaries of I. Vurgaftman, J. R. Meyer and L. R. Ram-Mohan, J. Appl. Phys. 89, 5815 (2001), \
            through a collection of its numbers, with the bowings -0.48 (direct) and 0.38 eV (X) as remembered from the paper; handbooks \
            put the crossover near x = 0.44",
    },
    electron_mass: MASSES,
    hole_mass: Sourced {
        law: Linear(0.6226, -0.0196),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: "linear between the library's InP and AlP (0.603 m0 from its Luttinger parameters along [001]; I. Vurgaftman et al., J. Appl. \
            Phys. 89, 5815 (2001), through a collection of its numbers)",
    },
    ladder: Sourced {
        law: Ladder::Between { at_zero: 0.14, at_one: 0.94, bowing: 0.0 },
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::ALLOY,
    },
    permittivity: Sourced {
        law: Linear(12.5, -2.7),
        temperature: (77.0, 400.0),
        origin: Origin::FromMemory,
        source: PERMITTIVITY,
    },
    electron_mobility: between(
        &[(0.0, &INP_ELECTRONS), (0.52, &ALINP_ELECTRONS)],
        "logarithm linear in x between the library's InP and the illustrative Al(0.52)In(0.48)P, and as that beyond",
    ),
    hole_mobility: between(
        &[(0.0, &INP_HOLES), (0.52, &ALINP_HOLES)],
        "logarithm linear in x between the library's InP and the illustrative Al(0.52)In(0.48)P, and as that beyond",
    ),
    radiative: RADIATIVE,
    electron_auger: AUGER_AS_GAAS,
    hole_auger: AUGER_AS_GAAS,
    electron_lifetime: 1e-9,
    hole_lifetime: 1e-9,
    optics: OpticalModel::Phosphide,
};

pub(crate) static ALGAINP: Record = Record {
    name: "AlGaInP",
    description: "aluminium gallium indium phosphide, lattice-matched to GaAs: from Ga(0.51)In(0.49)P at x = 0 to Al(0.52)In(0.48)P at x = 1, \
        direct below x = 0.55",
    composition: Some((0.0, 1.0)),
    minima: Sourced {
        law: &[
            Minimum {
                valley: Valley::Bowed { at_zero: &GAINP_DIRECT, at_one: &ALINP_DIRECT, bowing: 0.18 },
                mass: Linear(0.088, 0.065),
            },
            Minimum {
                valley: Valley::Bowed { at_zero: &GAINP_X, at_one: &ALINP_X, bowing: 0.0 },
                mass: Linear(0.966, -0.110),
            },
            Minimum {
                valley: Valley::Bowed { at_zero: &GAINP_L, at_one: &ALINP_L, bowing: 0.0 },
                mass: Linear(0.616, 0.003),
            },
        ],
        temperature: (20.0, 600.0),
        origin: Origin::FromMemory,
        source: "between the library's GaInP and AlInP, with a bowing of 0.18 eV of the direct gap and none of the others; I. Vurgaftman, \
            J. R. Meyer and L. R. Ram-Mohan, J. Appl. Phys. 89, 5815 (2001), from memory",
    },
    electron_mass: MASSES,
    hole_mass: Sourced {
        law: Linear(0.733, -0.121),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: "linear between the library's GaInP and AlInP",
    },
    ladder: Sourced {
        law: Ladder::Between { at_zero: 0.310, at_one: 0.556, bowing: 0.0 },
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: "linear between the library's GaInP (measured) and AlInP (alloy of the binaries)",
    },
    permittivity: Sourced {
        law: Linear(11.8, -0.7),
        temperature: (77.0, 400.0),
        origin: Origin::FromMemory,
        source: "linear between the library's GaInP and AlInP, from memory",
    },
    electron_mobility: between(
        &[(0.0, &GAINP_ELECTRONS), (1.0, &ALINP_ELECTRONS)],
        "logarithm linear in x between the library's GaInP and the illustrative AlInP",
    ),
    hole_mobility: between(
        &[(0.0, &GAINP_HOLES), (1.0, &ALINP_HOLES)],
        "logarithm linear in x between the library's GaInP and the illustrative AlInP",
    ),
    radiative: RADIATIVE,
    electron_auger: AUGER_AS_GAAS,
    hole_auger: AUGER_AS_GAAS,
    electron_lifetime: 1e-9,
    hole_lifetime: 1e-9,
    optics: OpticalModel::Phosphide,
};
