//! The built-in materials: one record each. A value without a source is a defect; what is from memory says so.

pub(crate) mod elemental;
pub(crate) mod gaas;
pub(crate) mod inp;
mod phosphides;

use super::record::Record;

/// Every material, in the order of listings.
pub(crate) static ALL: [&Record; 8] = [
    &gaas::GAAS,
    &gaas::ALGAAS,
    &phosphides::GAINP,
    &phosphides::ALINP,
    &inp::INP,
    &inp::GAINAS,
    &elemental::SI,
    &elemental::GE,
];

/// The record of this name.
pub(crate) fn find(name: &str) -> Option<&'static Record> {
    ALL.iter().copied().find(|r| r.name == name)
}

/// Names of the built-in materials, in the order of listings.
pub fn names() -> impl Iterator<Item = &'static str> {
    ALL.iter().map(|r| r.name)
}

/// Sources that several records share.
mod cite {
    pub const VURGAFTMAN: &str = "I. Vurgaftman, J. R. Meyer and L. R. Ram-Mohan, J. Appl. Phys. 89, 5815 (2001), through a \
        collection of its numbers; not checked against the paper";
    pub const ALLOY: &str = "alloy of the binaries and bowing of I. Vurgaftman, J. R. Meyer and L. R. Ram-Mohan, J. Appl. \
        Phys. 89, 5815 (2001), through a collection of its numbers; not checked against the paper";
    pub const SOTOODEH: &str = "coefficients of M. Sotoodeh, A. H. Khalid and A. A. Rezazadeh, J. Appl. Phys. 87, 2890 (2000), from \
        memory; majority carriers (Hall)";
    pub const NSM: &str = "the NSM archive of semiconductor parameters (Ioffe Institute)";
    pub const HILSUM: &str = "doping dependence 1 / (1 + sqrt(N / 1e17 cm^-3)) of C. Hilsum, Electron. Lett. 10, 259 (1974), from \
        memory";
}
