//! The built-in materials: one record each. A value without a source is a defect; what is from memory says so.

mod alloys;
mod binaries;
pub(crate) mod elemental;
pub(crate) mod gaas;
pub(crate) mod inp;
mod phosphides;

use super::record::Record;

/// Every material, in the order of listings. A name may stand twice: for a lattice-matched alloy, which takes no composition,
/// and for the same alloy of any composition.
pub(crate) static ALL: [&Record; 16] = [
    &gaas::GAAS,
    &gaas::ALGAAS,
    &binaries::ALAS,
    &alloys::GAASP,
    &phosphides::GAINP,
    &alloys::GAINP_X_RECORD,
    &phosphides::ALINP,
    &alloys::ALINP_X_RECORD,
    &alloys::ALGAINP,
    &inp::INP,
    &inp::GAINAS,
    &alloys::GAINAS_X,
    &binaries::INAS,
    &binaries::GASB,
    &elemental::SI,
    &elemental::GE,
];

/// The record of this name for a material with a composition, or without one; where there is no such record, the other.
pub(crate) fn find(name: &str, composed: bool) -> Option<&'static Record> {
    let mut named = ALL.iter().copied().filter(|r| r.name == name);
    let first = named.next()?;
    if first.composition.is_some() == composed {
        return Some(first);
    }
    Some(named.find(|r| r.composition.is_some() == composed).unwrap_or(first))
}

/// Names of the built-in materials, in the order of listings.
pub fn names() -> impl Iterator<Item = &'static str> {
    let repeated = |i: usize| ALL[..i].iter().any(|r| r.name == ALL[i].name);
    (0..ALL.len()).filter(move |i| !repeated(*i)).map(|i| ALL[i].name)
}

/// Sources that several records share.
mod cite {
    pub const VURGAFTMAN: &str = "I. Vurgaftman, J. R. Meyer and L. R. Ram-Mohan, J. Appl. Phys. 89, 5815 (2001), through a \
        collection of its numbers; not checked against the paper";
    pub const ALLOY: &str = "alloy of the binaries and bowing of I. Vurgaftman, J. R. Meyer and L. R. Ram-Mohan, J. Appl. \
        Phys. 89, 5815 (2001), through a collection of its numbers; not checked against the paper";
    pub const SOTOODEH: &str = "coefficients of M. Sotoodeh, A. H. Khalid and A. A. Rezazadeh, J. Appl. Phys. 87, 2890 (2000), from \
        memory; majority carriers (Hall)";
    pub const SOTOODEH_HELD: &str = "coefficients of M. Sotoodeh, A. H. Khalid and A. A. Rezazadeh, J. Appl. Phys. 87, 2890 (2000), from \
        memory; the reference doping is kept at every temperature; majority carriers (Hall)";
    pub const SPHERE: &str = "masses of heavy and light holes 1 / (g1 -+ 2 g), g = (2 g2 + 3 g3)/5 of the Luttinger parameters (bands \
        averaged over directions), (mh^1.5 + ml^1.5)^(2/3); alloys linear in x; I. Vurgaftman et al., J. Appl. Phys. 89, 5815 (2001), \
        through a collection of its numbers";
    pub const AUGER_AS_GAAS: &str = "as in GaAs, no source";
    pub const NSM: &str = "the NSM archive of semiconductor parameters (Ioffe Institute)";
    pub const HILSUM: &str = "doping dependence 1 / (1 + sqrt(N / 1e17 cm^-3)) of C. Hilsum, Electron. Lett. 10, 259 (1974), from \
        memory";
}
