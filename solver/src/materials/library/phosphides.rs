//! GaInP and AlInP lattice-matched to GaAs.

use super::super::law::{Linear, Mobility, Valley};
use super::super::record::{Ladder, Minimum, OpticalModel, Origin, Record, Sourced};
use super::cite;

pub(super) static GAP_DIRECT: Valley = Valley::Phonon { zero: 2.886, strength: 0.1081, half: 164.0 };
pub(super) static ALP_DIRECT: Valley = Valley::Varshni { zero: 3.63, alpha: 5.771e-4, beta: 372.0 };
pub(super) static ALP_X: Valley = Valley::Varshni { zero: 2.52, alpha: 3.18e-4, beta: 588.0 };
/// InP as the end of an alloy, from the collection that the alloy's bowing is from; the library's InP stands on another set.
pub(super) static INP_DIRECT: Valley = Valley::Varshni { zero: 1.4236, alpha: 3.63e-4, beta: 162.0 };
/// The collection gives a change linear in T (beta = 0).
pub(super) static INP_X: Valley = Valley::Varshni { zero: 2.384, alpha: 3.7e-4, beta: 0.0 };

const GAINP_ELECTRONS_LAW: Mobility = Mobility::CaugheyThomas {
    low: 400.0,
    high: 4300.0,
    reference: 2e16,
    power: 0.70,
    lattice: 1.66,
    doping: 0.0,
};
pub(super) static GAINP_ELECTRONS: Mobility = GAINP_ELECTRONS_LAW;
const GAINP_HOLES_LAW: Mobility = Mobility::CaugheyThomas {
    low: 15.0,
    high: 150.0,
    reference: 1.5e17,
    power: 0.80,
    lattice: 2.0,
    doping: 0.0,
};
pub(super) static GAINP_HOLES: Mobility = GAINP_HOLES_LAW;
const ALINP_ELECTRONS_LAW: Mobility =
    Mobility::CaugheyThomas { low: 0.0, high: 200.0, reference: 1e17, power: 0.5, lattice: 2.0, doping: 0.0 };
pub(super) static ALINP_ELECTRONS: Mobility = ALINP_ELECTRONS_LAW;
const ALINP_HOLES_LAW: Mobility =
    Mobility::CaugheyThomas { low: 0.0, high: 40.0, reference: 1e17, power: 0.5, lattice: 2.0, doping: 0.0 };
pub(super) static ALINP_HOLES: Mobility = ALINP_HOLES_LAW;

pub(crate) static GAINP: Record = Record {
    name: "GaInP",
    description: "gallium indium phosphide Ga(0.51)In(0.49)P, disordered, lattice-matched to GaAs",
    composition: None,
    minima: Sourced {
        law: &[Minimum {
            valley: Valley::Alloy { share: 0.51, first: &GAP_DIRECT, second: &INP_DIRECT, bowing: 0.65 },
            mass: Linear(0.088, 0.0),
        }],
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::ALLOY,
    },
    electron_mass: Sourced {
        law: (),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: "mass 0.088 m0; the NSM archive of semiconductor parameters (Ioffe Institute)",
    },
    hole_mass: Sourced {
        law: Linear(0.733, 0.0),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: "masses 0.7 and 0.12 m0 of heavy and light holes, (mh^1.5 + ml^1.5)^(2/3); the NSM archive of semiconductor \
            parameters (Ioffe Institute)",
    },
    ladder: Sourced {
        law: Ladder::Step(0.310),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: "310 meV +- 5 % below GaAs, measured by Lindell et al., J. Appl. Phys. (1997), through an abstract. Published \
            offsets scatter with ordering: conduction steps from 0.095 to 0.21 eV are reported; set `affinity` to use another",
    },
    permittivity: Sourced {
        law: Linear(11.8, 0.0),
        temperature: (77.0, 400.0),
        origin: Origin::SecondHand,
        source: cite::NSM,
    },
    electron_mobility: Sourced {
        law: GAINP_ELECTRONS_LAW,
        temperature: (200.0, 400.0),
        origin: Origin::FromMemory,
        source: "coefficients of M. Sotoodeh, A. H. Khalid and A. A. Rezazadeh, J. Appl. Phys. 87, 2890 (2000), from memory; \
            the reference doping is kept at every temperature; majority carriers (Hall)",
    },
    hole_mobility: Sourced {
        law: GAINP_HOLES_LAW,
        temperature: (200.0, 400.0),
        origin: Origin::FromMemory,
        source: "coefficients of M. Sotoodeh, A. H. Khalid and A. A. Rezazadeh, J. Appl. Phys. 87, 2890 (2000), from memory; \
            the reference doping is kept at every temperature; majority carriers (Hall)",
    },
    radiative: Sourced {
        law: 1e-16,
        temperature: (250.0, 350.0),
        origin: Origin::Illustrative,
        source: "order of magnitude 1e-10 cm^3/s of a direct gap, no source",
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
    electron_lifetime: 20e-9,
    hole_lifetime: 20e-9,
    optics: OpticalModel::GaInP,
};

pub(crate) static ALINP: Record = Record {
    name: "AlInP",
    description: "aluminium indium phosphide Al(0.52)In(0.48)P, indirect (X), lattice-matched to GaAs",
    composition: None,
    minima: Sourced {
        law: &[
            Minimum {
                valley: Valley::Alloy { share: 0.52, first: &ALP_DIRECT, second: &INP_DIRECT, bowing: -0.48 },
                mass: Linear(0.153, 0.0),
            },
            Minimum {
                valley: Valley::Alloy { share: 0.52, first: &ALP_X, second: &INP_X, bowing: 0.38 },
                mass: Linear(0.856, 0.0),
            },
        ],
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: "alloy of the binaries of I. Vurgaftman, J. R. Meyer and L. R. Ram-Mohan, J. Appl. Phys. 89, 5815 (2001), \
            through a collection of its numbers, with the bowings -0.48 (direct) and 0.38 eV (X) as remembered from the paper",
    },
    electron_mass: Sourced {
        law: (),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: "masses 0.153 (direct) and 0.856 m0 (X, all minima together): mean of AlP and InP by share; I. Vurgaftman et \
            al., J. Appl. Phys. 89, 5815 (2001), through a collection of its numbers",
    },
    hole_mass: Sourced {
        law: Linear(0.612, 0.0),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: "mean by share of AlP (0.603 m0 from its Luttinger parameters along [001]; I. Vurgaftman et al., J. Appl. Phys. \
            89, 5815 (2001), through a collection of its numbers) and the library's InP",
    },
    ladder: Sourced {
        law: Ladder::Step(0.556),
        temperature: (20.0, 600.0),
        origin: Origin::SecondHand,
        source: cite::ALLOY,
    },
    permittivity: Sourced {
        law: Linear(11.1, 0.0),
        temperature: (77.0, 400.0),
        origin: Origin::FromMemory,
        source: "mean by share of AlP 9.8 and InP 12.5, from memory",
    },
    electron_mobility: Sourced {
        law: ALINP_ELECTRONS_LAW,
        temperature: (200.0, 400.0),
        origin: Origin::Illustrative,
        source: "200 cm^2/Vs for the pure crystal, no source; doping dependence of C. Hilsum, Electron. Lett. 10, 259 (1974), \
            from memory",
    },
    hole_mobility: Sourced {
        law: ALINP_HOLES_LAW,
        temperature: (200.0, 400.0),
        origin: Origin::Illustrative,
        source: "40 cm^2/Vs for the pure crystal, no source; doping dependence of C. Hilsum, Electron. Lett. 10, 259 (1974), \
            from memory",
    },
    radiative: Sourced {
        law: 1e-16,
        temperature: (250.0, 350.0),
        origin: Origin::Illustrative,
        source: "GaInP's coefficient times the share of the electrons in the direct valley: a stated model",
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
    optics: OpticalModel::AlInP,
};
