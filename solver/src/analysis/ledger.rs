//! The account of photons, carriers and free energy of a solution.

/// Which account a line belongs to.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum LedgerPart {
    /// Photons, as a current density q times photons, A/m^2.
    Photons,
    /// Carriers: generation, recombination, extraction, A/m^2.
    Carriers,
    /// Free energy, W/m^2.
    FreeEnergy,
    /// Photon energy, W/m^2.
    PhotonEnergy,
}

/// One line.
#[derive(Clone, Debug, PartialEq)]
pub struct LedgerLine {
    /// The account.
    pub part: LedgerPart,
    /// Layer, contact or interface it concerns; empty for the whole stack.
    pub place: String,
    /// What it is ("absorbed", "Shockley-Read-Hall", "electron transport", ...).
    pub channel: String,
    /// A/m^2 or W/m^2; sources positive, sinks positive, told apart by `source`.
    pub value: f64,
    /// True for what comes in, false for where it goes.
    pub source: bool,
}

/// The account of a solution.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Ledger {
    /// All lines, by account.
    pub lines: Vec<LedgerLine>,
    /// Photons in minus photons accounted for, over photons in.
    pub photon_closure: f64,
    /// Difference of the terminal current and the independently evaluated edge current, A/m^2.
    pub carrier_closure: f64,
    /// What the difference may be by the rounding of that edge, A/m^2, plus 1e-9 of the current.
    pub carrier_bound: f64,
    /// Whether the check says anything: false where rounding dominates or the current had to be taken from the edges.
    pub carrier_checked: bool,
    /// Free energy in minus out, W/m^2.
    pub energy_closure: f64,
    /// Bound on it: 1e-12 of the sum of absolute terms plus computed rounding, W/m^2.
    pub energy_bound: f64,
}
