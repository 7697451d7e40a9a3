//! Silicon and germanium.

use super::super::law::{Linear, Mobility, Valley};
use super::super::record::{Ladder, Minimum, OpticalModel, Origin, Record, Sourced};
use super::cite;

pub(crate) static SI: Record = Record {
    name: "Si",
    description: "silicon",
    composition: None,
    minima: Sourced {
        law: &[Minimum {
            valley: Valley::Varshni { zero: 1.170, alpha: 4.73e-4, beta: 636.0 },
            mass: Linear(1.08, 0.0),
        }],
        temperature: (20.0, 600.0),
        origin: Origin::FromMemory,
        source: "Varshni coefficients in common use, from memory",
    },
    electron_mass: Sourced {
        law: (),
        temperature: (200.0, 500.0),
        origin: Origin::SecondHand,
        source: "mass 1.08 m0 of a textbook's table (B. Van Zeghbroeck, Principles of Semiconductor Devices)",
    },
    hole_mass: Sourced {
        law: Linear(1.04, 0.0),
        temperature: (200.0, 500.0),
        origin: Origin::FromMemory,
        source: "mass 1.04 m0, which gives the density 2.65e19 cm^-3 of S. M. Sze and K. K. Ng, Physics of Semiconductor Devices, \
            from memory, and with the library's gap an intrinsic density within 2 % of 9.65e9 cm^-3 at 300 K",
    },
    ladder: Sourced {
        law: Ladder::Step(0.21),
        temperature: (20.0, 600.0),
        origin: Origin::FromMemory,
        source: "model-solid positions of C. G. Van de Walle, Phys. Rev. B 39, 1871 (1989), from memory; matters only where Si meets \
            another material",
    },
    permittivity: Sourced {
        law: Linear(11.9, 0.0),
        temperature: (77.0, 400.0),
        origin: Origin::FromMemory,
        source: "common handbook value, from memory",
    },
    electron_mobility: Sourced {
        law: Mobility::Arora { least: (88.0, -0.57), lattice: (1252.0, -2.33), reference: 1.26e17 },
        temperature: (250.0, 500.0),
        origin: Origin::FromMemory,
        source: "N. D. Arora, J. R. Hauser and D. J. Roulston, IEEE Trans. Electron Devices 29, 292 (1982); coefficients from memory; \
            stated accuracy 13 % up to 1e20 cm^-3",
    },
    hole_mobility: Sourced {
        law: Mobility::Arora { least: (54.3, -0.57), lattice: (407.0, -2.23), reference: 2.35e17 },
        temperature: (250.0, 500.0),
        origin: Origin::FromMemory,
        source: "N. D. Arora, J. R. Hauser and D. J. Roulston, IEEE Trans. Electron Devices 29, 292 (1982); coefficients from memory; \
            stated accuracy 13 % up to 1e20 cm^-3",
    },
    radiative: Sourced {
        law: 4.73e-21,
        temperature: (250.0, 350.0),
        origin: Origin::FromMemory,
        source: "4.73e-15 cm^3/s at 300 K, kept at every temperature; T. Trupke et al., J. Appl. Phys. 94, 4930 (2003), from memory",
    },
    electron_auger: Sourced {
        law: 2.8e-43,
        temperature: (250.0, 400.0),
        origin: Origin::FromMemory,
        source: "2.8e-31 cm^6/s; J. Dziewior and W. Schmid, Appl. Phys. Lett. 31, 346 (1977), from memory",
    },
    hole_auger: Sourced {
        law: 0.99e-43,
        temperature: (250.0, 400.0),
        origin: Origin::FromMemory,
        source: "0.99e-31 cm^6/s; J. Dziewior and W. Schmid, Appl. Phys. Lett. 31, 346 (1977), from memory",
    },
    electron_lifetime: 100e-6,
    hole_lifetime: 100e-6,
    optics: OpticalModel::Si,
};

pub(crate) static GE: Record = Record {
    name: "Ge",
    description: "germanium",
    composition: None,
    minima: Sourced {
        law: &[Minimum {
            valley: Valley::Varshni { zero: 0.7437, alpha: 4.774e-4, beta: 235.0 },
            mass: Linear(0.56, 0.0),
        }],
        temperature: (20.0, 600.0),
        origin: Origin::FromMemory,
        source: "Varshni coefficients in common use, from memory",
    },
    electron_mass: Sourced {
        law: (),
        temperature: (200.0, 500.0),
        origin: Origin::SecondHand,
        source: "mass 0.56 m0 of a textbook's table (B. Van Zeghbroeck, Principles of Semiconductor Devices)",
    },
    hole_mass: Sourced {
        law: Linear(0.29, 0.0),
        temperature: (200.0, 500.0),
        origin: Origin::SecondHand,
        source: "mass 0.29 m0 of a textbook's table (B. Van Zeghbroeck, Principles of Semiconductor Devices)",
    },
    ladder: Sourced {
        law: Ladder::Step(-0.55),
        temperature: (20.0, 600.0),
        origin: Origin::FromMemory,
        source: "model-solid positions of C. G. Van de Walle, Phys. Rev. B 39, 1871 (1989), from memory; photoemission values near \
            0.53 to 0.56 eV are remembered too",
    },
    permittivity: Sourced {
        law: Linear(16.2, 0.0),
        temperature: (77.0, 400.0),
        origin: Origin::FromMemory,
        source: "common handbook value, from memory",
    },
    electron_mobility: Sourced {
        law: Mobility::CaugheyThomas {
            low: 0.0,
            high: 3900.0,
            reference: 1e17,
            power: 0.5,
            lattice: 1.66,
            doping: 0.0,
        },
        temperature: (200.0, 400.0),
        origin: Origin::FromMemory,
        source: cite::HILSUM,
    },
    hole_mobility: Sourced {
        law: Mobility::CaugheyThomas {
            low: 0.0,
            high: 1900.0,
            reference: 1e17,
            power: 0.5,
            lattice: 2.33,
            doping: 0.0,
        },
        temperature: (200.0, 400.0),
        origin: Origin::FromMemory,
        source: cite::HILSUM,
    },
    radiative: Sourced {
        law: 5.25e-20,
        temperature: (250.0, 350.0),
        origin: Origin::FromMemory,
        source: "5.25e-14 cm^3/s at 300 K, kept at every temperature; Y. P. Varshni, Phys. Status Solidi 19, 459 (1967), from memory",
    },
    electron_auger: Sourced {
        law: 1e-43,
        temperature: (250.0, 350.0),
        origin: Origin::FromMemory,
        source: "order of magnitude 1e-31 cm^6/s, from memory",
    },
    hole_auger: Sourced {
        law: 1e-43,
        temperature: (250.0, 350.0),
        origin: Origin::FromMemory,
        source: "order of magnitude 1e-31 cm^6/s, from memory",
    },
    electron_lifetime: 10e-6,
    hole_lifetime: 10e-6,
    optics: OpticalModel::Ge,
};
