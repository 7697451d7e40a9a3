//! GaAs and AlGaAs.

use super::super::law::{Linear, Mobility, Valley};
use super::super::record::{Ladder, Minimum, OpticalModel, Origin, Record, Sourced};
use super::binaries::{ALAS_DIRECT, ALAS_L, ALAS_X};
use super::cite;

const GAAS_GAP: Valley = Valley::Varshni { zero: 1.519, alpha: 5.405e-4, beta: 204.0 };
pub(super) static GAAS_DIRECT: Valley = GAAS_GAP;
pub(super) static GAAS_X: Valley = Valley::Varshni { zero: 1.981, alpha: 4.60e-4, beta: 204.0 };
pub(super) static GAAS_L: Valley = Valley::Varshni { zero: 1.815, alpha: 6.05e-4, beta: 204.0 };

const ELECTRONS: Mobility = Mobility::CaugheyThomas {
    low: 500.0,
    high: 9400.0,
    reference: 6e16,
    power: 0.394,
    lattice: 2.1,
    doping: 3.0,
};
const HOLES: Mobility = Mobility::CaugheyThomas {
    low: 20.0,
    high: 491.5,
    reference: 1.48e17,
    power: 0.38,
    lattice: 2.2,
    doping: 3.0,
};

pub(super) static GAAS_ELECTRONS: Mobility = ELECTRONS;
pub(super) static GAAS_HOLES: Mobility = HOLES;

pub(crate) static GAAS: Record = Record {
    name: "GaAs",
    description: "gallium arsenide, the reference of the ladder of valence-band positions",
    composition: None,
    minima: Sourced {
        law: &[Minimum { valley: GAAS_GAP, mass: Linear(0.067, 0.0) }],
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::VURGAFTMAN,
    },
    electron_mass: Sourced {
        law: (),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: "mass 0.067 m0 of the direct valley; I. Vurgaftman et al., J. Appl. Phys. 89, 5815 (2001), through a \
            collection of its numbers",
    },
    hole_mass: Sourced {
        law: Linear(0.47, 0.0),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: "mass 0.47 m0 of a textbook's table (B. Van Zeghbroeck, Principles of Semiconductor Devices)",
    },
    ladder: Sourced {
        law: Ladder::Step(0.0),
        temperature: (20.0, 1000.0),
        origin: Origin::SecondHand,
        source: "reference of the ladder; affinity 4.07 eV at every temperature, the NSM archive of semiconductor parameters (Ioffe \
            Institute)",
    },
    permittivity: Sourced {
        law: Linear(12.90, 0.0),
        temperature: (77.0, 400.0),
        origin: Origin::SecondHand,
        source: cite::NSM,
    },
    electron_mobility: Sourced {
        law: ELECTRONS,
        temperature: (77.0, 500.0),
        origin: Origin::FromMemory,
        source: cite::SOTOODEH,
    },
    hole_mobility: Sourced {
        law: HOLES,
        temperature: (77.0, 500.0),
        origin: Origin::FromMemory,
        source: cite::SOTOODEH,
    },
    radiative: Sourced {
        law: 7.2e-16,
        temperature: (250.0, 350.0),
        origin: Origin::FromMemory,
        source: "7.2e-10 cm^3/s at 300 K, kept at every temperature; Y. P. Varshni, Phys. Status Solidi 19, 459 (1967), \
            from memory; values from 2e-10 to 9e-10 are found",
    },
    electron_auger: Sourced {
        law: 1e-42,
        temperature: (250.0, 350.0),
        origin: Origin::FromMemory,
        source: "order of magnitude 1e-30 cm^6/s, from memory",
    },
    hole_auger: Sourced {
        law: 1e-42,
        temperature: (250.0, 350.0),
        origin: Origin::FromMemory,
        source: "order of magnitude 1e-30 cm^6/s, from memory; heavily carbon-doped material is reported near 7e-30",
    },
    electron_lifetime: 20e-9,
    hole_lifetime: 20e-9,
    optics: OpticalModel::GaAs,
};

pub(crate) static ALGAAS: Record = Record {
    name: "AlGaAs",
    description: "aluminium gallium arsenide Al(x)Ga(1-x)As, direct below x = 0.45, indirect (X) above",
    composition: Some((0.0, 1.0)),
    minima: Sourced {
        law: &[
            Minimum {
                valley: Valley::Graded {
                    room: None,
                    coefficients: [1.247, 0.0],
                    at_zero: &GAAS_DIRECT,
                    at_one: &ALAS_DIRECT,
                },
                mass: Linear(0.067, 0.083),
            },
            Minimum {
                valley: Valley::Graded {
                    room: Some(1.900),
                    coefficients: [0.125, 0.143],
                    at_zero: &GAAS_X,
                    at_one: &ALAS_X,
                },
                mass: Linear(0.85, -0.14),
            },
            Minimum {
                valley: Valley::Graded {
                    room: Some(1.708),
                    coefficients: [0.642, 0.0],
                    at_zero: &GAAS_L,
                    at_one: &ALAS_L,
                },
                mass: Linear(0.56, 0.10),
            },
        ],
        temperature: (20.0, 500.0),
        origin: Origin::FromMemory,
        source: "valleys at 300 K: S. Adachi, J. Appl. Phys. 58, R1 (1985), from memory, the direct one starting from the \
            library's GaAs; change with temperature: Varshni terms of GaAs and AlAs, linear in x (I. Vurgaftman et al., J. \
            Appl. Phys. 89, 5815 (2001), second-hand)",
    },
    electron_mass: Sourced {
        law: (),
        temperature: (20.0, 500.0),
        origin: Origin::FromMemory,
        source: "masses 0.067 + 0.083 x (direct), 0.85 - 0.14 x (X), 0.56 + 0.10 x (L), all minima of a kind together; S. \
            Adachi, J. Appl. Phys. 58, R1 (1985), from memory. The three add up, each weighted by exp of its height above the \
            lowest over kT: exact for non-degenerate electrons and continuous through the crossover",
    },
    hole_mass: Sourced {
        law: Linear(0.47, 0.27),
        temperature: (20.0, 500.0),
        origin: Origin::SecondHand,
        source: "the library's GaAs, with the slope of the masses 0.51 + 0.25 x and 0.082 + 0.068 x of the NSM archive of \
            semiconductor parameters (Ioffe Institute)",
    },
    ladder: Sourced {
        law: Ladder::ShareOfDirectGap(0.39),
        temperature: (20.0, 500.0),
        origin: Origin::SecondHand,
        source: "valence-band step 0.39 +- 0.02 of the difference of the direct gaps, at every x; measured, 1985, through an \
            abstract",
    },
    permittivity: Sourced {
        law: Linear(12.90, -2.84),
        temperature: (77.0, 400.0),
        origin: Origin::SecondHand,
        source: cite::NSM,
    },
    electron_mobility: Sourced {
        law: Mobility::Scaled {
            base: &GAAS_ELECTRONS,
            factors: &[
                [1.0, -22000.0 / 8000.0, 10000.0 / 8000.0],
                [-255.0 / 8000.0, 1160.0 / 8000.0, -720.0 / 8000.0],
            ],
        },
        temperature: (77.0, 500.0),
        origin: Origin::FromMemory,
        source: "the library's GaAs times the ratio of the pure mobilities 8000 - 22000 x + 10000 x^2 (direct) and -255 + 1160 x \
            - 720 x^2 (indirect) to 8000 cm^2/Vs, from memory; the larger counts",
    },
    hole_mobility: Sourced {
        law: Mobility::Scaled { base: &GAAS_HOLES, factors: &[[1.0, -970.0 / 370.0, 740.0 / 370.0]] },
        temperature: (77.0, 500.0),
        origin: Origin::FromMemory,
        source: "the library's GaAs times the ratio of the pure mobility 370 - 970 x + 740 x^2 to 370 cm^2/Vs, from memory",
    },
    radiative: Sourced {
        law: 7.2e-16,
        temperature: (250.0, 350.0),
        origin: Origin::Illustrative,
        source: "GaAs's coefficient times the share of the electrons in the direct valley: a stated model",
    },
    electron_auger: Sourced {
        law: 1e-42,
        temperature: (250.0, 350.0),
        origin: Origin::Illustrative,
        source: "as in GaAs, no source",
    },
    hole_auger: Sourced {
        law: 1e-42,
        temperature: (250.0, 350.0),
        origin: Origin::Illustrative,
        source: "as in GaAs, no source",
    },
    electron_lifetime: 1e-9,
    hole_lifetime: 1e-9,
    optics: OpticalModel::AlGaAs,
};
