//! InP and GaInAs lattice-matched to it.

use super::super::law::{Linear, Mobility, Valley};
use super::super::record::{Ladder, Minimum, OpticalModel, Origin, Record, Sourced};
use super::binaries::INAS_DIRECT;
use super::cite;

const INP_ELECTRONS_LAW: Mobility = Mobility::CaugheyThomas {
    low: 400.0,
    high: 5200.0,
    reference: 3e17,
    power: 0.47,
    lattice: 2.0,
    doping: 3.25,
};
pub(super) static INP_ELECTRONS: Mobility = INP_ELECTRONS_LAW;
const INP_HOLES_LAW: Mobility = Mobility::CaugheyThomas {
    low: 10.0,
    high: 170.0,
    reference: 4.87e17,
    power: 0.62,
    lattice: 2.0,
    doping: 3.0,
};
pub(super) static INP_HOLES: Mobility = INP_HOLES_LAW;
const GAINAS_ELECTRONS_LAW: Mobility = Mobility::CaugheyThomas {
    low: 300.0,
    high: 14000.0,
    reference: 1.3e17,
    power: 0.48,
    lattice: 1.59,
    doping: 3.68,
};
pub(super) static GAINAS_ELECTRONS: Mobility = GAINAS_ELECTRONS_LAW;
const GAINAS_HOLES_LAW: Mobility = Mobility::CaugheyThomas {
    low: 10.0,
    high: 320.0,
    reference: 4.9e17,
    power: 0.403,
    lattice: 1.59,
    doping: 0.0,
};
pub(super) static GAINAS_HOLES: Mobility = GAINAS_HOLES_LAW;

pub(crate) static INP: Record = Record {
    name: "InP",
    description: "indium phosphide",
    composition: None,
    minima: Sourced {
        law: &[Minimum {
            valley: Valley::Varshni { zero: 1.421, alpha: 4.9e-4, beta: 327.0 },
            mass: Linear(0.08, 0.0),
        }],
        temperature: (20.0, 800.0),
        origin: Origin::SecondHand,
        source: cite::NSM,
    },
    electron_mass: Sourced {
        law: (),
        temperature: (20.0, 800.0),
        origin: Origin::SecondHand,
        source: "mass 0.08 m0; the NSM archive of semiconductor parameters (Ioffe Institute)",
    },
    hole_mass: Sourced {
        law: Linear(0.6226, 0.0),
        temperature: (20.0, 800.0),
        origin: Origin::SecondHand,
        source: "masses 0.6 and 0.089 m0 of heavy and light holes, (mh^1.5 + ml^1.5)^(2/3); the NSM archive of semiconductor \
            parameters (Ioffe Institute)",
    },
    ladder: Sourced {
        law: Ladder::Step(0.14),
        temperature: (20.0, 800.0),
        origin: Origin::SecondHand,
        source: cite::VURGAFTMAN,
    },
    permittivity: Sourced {
        law: Linear(12.5, 0.0),
        temperature: (77.0, 400.0),
        origin: Origin::SecondHand,
        source: cite::NSM,
    },
    electron_mobility: Sourced {
        law: INP_ELECTRONS_LAW,
        temperature: (77.0, 500.0),
        origin: Origin::FromMemory,
        source: cite::SOTOODEH,
    },
    hole_mobility: Sourced {
        law: INP_HOLES_LAW,
        temperature: (77.0, 500.0),
        origin: Origin::FromMemory,
        source: cite::SOTOODEH,
    },
    radiative: Sourced {
        law: 1.26e-15,
        temperature: (250.0, 350.0),
        origin: Origin::FromMemory,
        source: "1.26e-9 cm^3/s at 300 K, kept at every temperature; Y. P. Varshni, Phys. Status Solidi 19, 459 (1967), from memory",
    },
    electron_auger: Sourced {
        law: 9e-43,
        temperature: (250.0, 350.0),
        origin: Origin::FromMemory,
        source: "9e-31 cm^6/s, from memory",
    },
    hole_auger: Sourced {
        law: 9e-43,
        temperature: (250.0, 350.0),
        origin: Origin::FromMemory,
        source: "9e-31 cm^6/s, from memory",
    },
    electron_lifetime: 20e-9,
    hole_lifetime: 20e-9,
    optics: OpticalModel::InP,
};

pub(crate) static GAINAS: Record = Record {
    name: "GaInAs",
    description: "gallium indium arsenide Ga(0.47)In(0.53)As, lattice-matched to InP",
    composition: None,
    minima: Sourced {
        law: &[Minimum {
            valley: Valley::Alloy {
                share: 0.47,
                first: &super::gaas::GAAS_DIRECT,
                second: &INAS_DIRECT,
                bowing: 0.477,
            },
            mass: Linear(0.041, 0.0),
        }],
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::ALLOY,
    },
    electron_mass: Sourced {
        law: (),
        temperature: (20.0, 600.0),
        origin: Origin::FromMemory,
        source: "mass 0.041 m0, from memory",
    },
    hole_mass: Sourced {
        law: Linear(0.462, 0.0),
        temperature: (20.0, 600.0),
        origin: Origin::FromMemory,
        source: "masses 0.45 and 0.052 m0 of heavy and light holes, (mh^1.5 + ml^1.5)^(2/3), from memory",
    },
    ladder: Sourced {
        law: Ladder::Step(-0.206),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::ALLOY,
    },
    permittivity: Sourced {
        law: Linear(13.9, 0.0),
        temperature: (77.0, 400.0),
        origin: Origin::FromMemory,
        source: "common handbook value, from memory",
    },
    electron_mobility: Sourced {
        law: GAINAS_ELECTRONS_LAW,
        temperature: (77.0, 500.0),
        origin: Origin::FromMemory,
        source: cite::SOTOODEH,
    },
    hole_mobility: Sourced {
        law: GAINAS_HOLES_LAW,
        temperature: (200.0, 400.0),
        origin: Origin::FromMemory,
        source: "coefficients of M. Sotoodeh, A. H. Khalid and A. A. Rezazadeh, J. Appl. Phys. 87, 2890 (2000), from memory; \
            the reference doping is kept at every temperature; majority carriers (Hall)",
    },
    radiative: Sourced {
        law: 0.96e-16,
        temperature: (250.0, 350.0),
        origin: Origin::SecondHand,
        source: "0.96e-10 cm^3/s at 300 K, kept at every temperature; the NSM archive of semiconductor parameters (Ioffe Institute)",
    },
    electron_auger: Sourced {
        law: 7e-41,
        temperature: (250.0, 350.0),
        origin: Origin::SecondHand,
        source: "7e-29 cm^6/s; the NSM archive of semiconductor parameters (Ioffe Institute)",
    },
    hole_auger: Sourced {
        law: 7e-41,
        temperature: (250.0, 350.0),
        origin: Origin::SecondHand,
        source: "7e-29 cm^6/s; the NSM archive of semiconductor parameters (Ioffe Institute)",
    },
    electron_lifetime: 100e-9,
    hole_lifetime: 100e-9,
    optics: OpticalModel::GaInAs,
};
