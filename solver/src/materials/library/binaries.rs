//! AlAs, InAs and GaSb. No optical tables: light on them needs an absorption from the script.

use super::super::law::{Linear, Mobility, Valley};
use super::super::record::{Ladder, Minimum, OpticalModel, Origin, Record, Sourced};
use super::cite;

pub(super) static ALAS_DIRECT: Valley = Valley::Varshni { zero: 3.099, alpha: 8.85e-4, beta: 530.0 };
pub(super) static ALAS_X: Valley = Valley::Varshni { zero: 2.24, alpha: 7.0e-4, beta: 530.0 };
pub(super) static ALAS_L: Valley = Valley::Varshni { zero: 2.46, alpha: 6.05e-4, beta: 204.0 };
pub(super) static INAS_DIRECT: Valley = Valley::Varshni { zero: 0.417, alpha: 2.76e-4, beta: 93.0 };
pub(super) static INAS_X: Valley = Valley::Varshni { zero: 1.433, alpha: 2.76e-4, beta: 93.0 };
pub(super) static INAS_L: Valley = Valley::Varshni { zero: 1.133, alpha: 2.76e-4, beta: 93.0 };

const INAS_ELECTRONS_LAW: Mobility = Mobility::CaugheyThomas {
    low: 1000.0,
    high: 34000.0,
    reference: 1.1e18,
    power: 0.32,
    lattice: 1.57,
    doping: 3.0,
};
const INAS_HOLES_LAW: Mobility = Mobility::CaugheyThomas {
    low: 20.0,
    high: 530.0,
    reference: 1.1e17,
    power: 0.46,
    lattice: 2.3,
    doping: 3.0,
};
pub(super) static INAS_ELECTRONS: Mobility = INAS_ELECTRONS_LAW;
pub(super) static INAS_HOLES: Mobility = INAS_HOLES_LAW;

pub(crate) static ALAS: Record = Record {
    name: "AlAs",
    description: "aluminium arsenide, indirect (X)",
    composition: None,
    minima: Sourced {
        law: &[
            Minimum {
                valley: Valley::Varshni { zero: 3.099, alpha: 8.85e-4, beta: 530.0 },
                mass: Linear(0.15, 0.0),
            },
            Minimum {
                valley: Valley::Varshni { zero: 2.24, alpha: 7.0e-4, beta: 530.0 },
                mass: Linear(0.750, 0.0),
            },
            Minimum {
                valley: Valley::Varshni { zero: 2.46, alpha: 6.05e-4, beta: 204.0 },
                mass: Linear(0.780, 0.0),
            },
        ],
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::VURGAFTMAN,
    },
    electron_mass: Sourced {
        law: (),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: "masses 0.15 (direct), 0.750 (X) and 0.780 m0 (L) of all minima of a kind, count^(2/3) (ml mt^2)^(1/3) of 3 and 4 minima; \
            I. Vurgaftman et al., J. Appl. Phys. 89, 5815 (2001), through a collection of its numbers",
    },
    hole_mass: Sourced {
        law: Linear(0.765, 0.0),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::SPHERE,
    },
    ladder: Sourced {
        law: Ladder::Step(0.53),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: "valence-band positions -1.33 and -0.80 eV of AlAs and GaAs; I. Vurgaftman et al., J. Appl. Phys. 89, 5815 (2001), \
            through a collection of its numbers. AlGaAs at x = 1 stands on another measurement, 0.04 eV higher",
    },
    permittivity: Sourced {
        law: Linear(10.06, 0.0),
        temperature: (77.0, 400.0),
        origin: Origin::SecondHand,
        source: cite::NSM,
    },
    electron_mobility: Sourced {
        law: Mobility::CaugheyThomas {
            low: 10.0,
            high: 400.0,
            reference: 5.46e17,
            power: 1.0,
            lattice: 2.1,
            doping: 0.0,
        },
        temperature: (200.0, 400.0),
        origin: Origin::FromMemory,
        source: cite::SOTOODEH_HELD,
    },
    hole_mobility: Sourced {
        law: Mobility::CaugheyThomas {
            low: 10.0,
            high: 200.0,
            reference: 3.84e17,
            power: 0.488,
            lattice: 2.24,
            doping: 0.0,
        },
        temperature: (200.0, 400.0),
        origin: Origin::FromMemory,
        source: cite::SOTOODEH_HELD,
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
        source: cite::AUGER_AS_GAAS,
    },
    hole_auger: Sourced {
        law: 1e-42,
        temperature: (250.0, 350.0),
        origin: Origin::Illustrative,
        source: cite::AUGER_AS_GAAS,
    },
    electron_lifetime: 1e-9,
    hole_lifetime: 1e-9,
    optics: OpticalModel::None,
};

pub(crate) static INAS: Record = Record {
    name: "InAs",
    description: "indium arsenide",
    composition: None,
    minima: Sourced {
        law: &[
            Minimum {
                valley: Valley::Varshni { zero: 0.417, alpha: 2.76e-4, beta: 93.0 },
                mass: Linear(0.026, 0.0),
            },
            Minimum {
                valley: Valley::Varshni { zero: 1.433, alpha: 2.76e-4, beta: 93.0 },
                mass: Linear(0.64, 0.0),
            },
            Minimum {
                valley: Valley::Varshni { zero: 1.133, alpha: 2.76e-4, beta: 93.0 },
                mass: Linear(0.29, 0.0),
            },
        ],
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::VURGAFTMAN,
    },
    electron_mass: Sourced {
        law: (),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: "masses 0.026 (direct), 0.64 (X) and 0.29 m0 (L), all minima of a kind together; I. Vurgaftman et al., J. Appl. Phys. 89, \
            5815 (2001), through a collection of its numbers; the band is not parabolic, so heavy doping fills less of it",
    },
    hole_mass: Sourced {
        law: Linear(0.549, 0.0),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::SPHERE,
    },
    ladder: Sourced {
        law: Ladder::Step(-0.21),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::VURGAFTMAN,
    },
    permittivity: Sourced {
        law: Linear(15.15, 0.0),
        temperature: (77.0, 400.0),
        origin: Origin::FromMemory,
        source: "common handbook value, from memory",
    },
    electron_mobility: Sourced {
        law: INAS_ELECTRONS_LAW,
        temperature: (77.0, 500.0),
        origin: Origin::FromMemory,
        source: cite::SOTOODEH,
    },
    hole_mobility: Sourced {
        law: INAS_HOLES_LAW,
        temperature: (77.0, 500.0),
        origin: Origin::FromMemory,
        source: cite::SOTOODEH,
    },
    radiative: Sourced {
        law: 1.1e-16,
        temperature: (250.0, 350.0),
        origin: Origin::FromMemory,
        source: "1.1e-10 cm^3/s at 300 K, kept at every temperature, from memory",
    },
    electron_auger: Sourced {
        law: 2.2e-39,
        temperature: (250.0, 350.0),
        origin: Origin::FromMemory,
        source: "2.2e-27 cm^6/s, from memory",
    },
    hole_auger: Sourced {
        law: 2.2e-39,
        temperature: (250.0, 350.0),
        origin: Origin::FromMemory,
        source: "2.2e-27 cm^6/s, from memory",
    },
    electron_lifetime: 20e-9,
    hole_lifetime: 20e-9,
    optics: OpticalModel::None,
};

pub(crate) static GASB: Record = Record {
    name: "GaSb",
    description: "gallium antimonide, direct with the L minimum close above",
    composition: None,
    minima: Sourced {
        law: &[
            Minimum {
                valley: Valley::Varshni { zero: 0.812, alpha: 4.17e-4, beta: 140.0 },
                mass: Linear(0.039, 0.0),
            },
            Minimum {
                valley: Valley::Varshni { zero: 1.141, alpha: 4.75e-4, beta: 94.0 },
                mass: Linear(0.870, 0.0),
            },
            Minimum {
                valley: Valley::Varshni { zero: 0.875, alpha: 5.97e-4, beta: 140.0 },
                mass: Linear(0.593, 0.0),
            },
        ],
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::VURGAFTMAN,
    },
    electron_mass: Sourced {
        law: (),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: "masses 0.039 (direct), 0.870 (X) and 0.593 m0 (L) of all minima of a kind, count^(2/3) (ml mt^2)^(1/3) of 3 and 4 minima; \
            I. Vurgaftman et al., J. Appl. Phys. 89, 5815 (2001), through a collection of its numbers. At 300 K the L minimum 26 meV up \
            holds most of the electrons",
    },
    hole_mass: Sourced {
        law: Linear(0.418, 0.0),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::SPHERE,
    },
    ladder: Sourced {
        law: Ladder::Step(-0.77),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::VURGAFTMAN,
    },
    permittivity: Sourced {
        law: Linear(15.7, 0.0),
        temperature: (77.0, 400.0),
        origin: Origin::FromMemory,
        source: "common handbook value, from memory",
    },
    electron_mobility: Sourced {
        law: Mobility::CaugheyThomas {
            low: 1050.0,
            high: 5650.0,
            reference: 2.8e17,
            power: 1.05,
            lattice: 2.0,
            doping: 0.0,
        },
        temperature: (200.0, 400.0),
        origin: Origin::FromMemory,
        source: "a fit of Hall mobilities, from memory; the reference doping is kept at every temperature",
    },
    hole_mobility: Sourced {
        law: Mobility::CaugheyThomas {
            low: 190.0,
            high: 875.0,
            reference: 9e17,
            power: 0.65,
            lattice: 1.7,
            doping: 0.0,
        },
        temperature: (200.0, 400.0),
        origin: Origin::FromMemory,
        source: "a fit of Hall mobilities, from memory; the reference doping is kept at every temperature",
    },
    radiative: Sourced {
        law: 1e-16,
        temperature: (250.0, 350.0),
        origin: Origin::FromMemory,
        source: "order of magnitude 1e-10 cm^3/s, from memory, times the share of the electrons in the direct valley",
    },
    electron_auger: Sourced {
        law: 5e-42,
        temperature: (250.0, 350.0),
        origin: Origin::FromMemory,
        source: "5e-30 cm^6/s, from memory",
    },
    hole_auger: Sourced {
        law: 5e-42,
        temperature: (250.0, 350.0),
        origin: Origin::FromMemory,
        source: "5e-30 cm^6/s, from memory",
    },
    electron_lifetime: 20e-9,
    hole_lifetime: 20e-9,
    optics: OpticalModel::None,
};
