//! The account of photons, carriers and free energy of a solution.
//!
//! Free energy after R. Brendel et al., Appl. Phys. Lett. 93, 173503 (2008) (from memory), in discrete form: generation
//! times splitting equals delivered power plus recombination times splitting plus the transport losses of electrons and
//! holes, each of which is >= 0.

use crate::device::{Device, Layer};
use crate::discretise::residual::interface_recombination;
use crate::discretise::{Carrier, Majority, Terminal, scales};
use crate::math::sum::CompensatedSum;
use crate::optics::{Illumination, PhotonAccount};
use crate::quantity::constants::ELEMENTARY_CHARGE;
use crate::solve::{Point, Problem};

use super::profiles::{Local, act, locals};

/// Which account a line belongs to.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum LedgerPart {
    /// Photons, as a current density q times photons, A/m^2.
    Photons,
    /// Photon energy, W/m^2.
    PhotonEnergy,
    /// Carriers: generation, recombination, extraction, A/m^2.
    Carriers,
    /// Free energy, W/m^2.
    FreeEnergy,
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
    /// A/m^2 or W/m^2. What comes in and where it goes are both positive, told apart by `source`.
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
    /// Terminal current minus the independently evaluated current of the best-conditioned edge, A/m^2.
    pub carrier_closure: f64,
    /// What that difference may be: 1e-9 of the current plus the rounding of that edge and of the sum, A/m^2.
    pub carrier_bound: f64,
    /// Whether the comparison says anything; false where rounding dominates it ("not independently checked").
    pub carrier_checked: bool,
    /// Free energy in minus out, W/m^2.
    pub energy_closure: f64,
    /// Bound on it: 1e-12 of the sum of absolute terms plus computed rounding, W/m^2.
    pub energy_bound: f64,
}

impl Ledger {
    /// The lines of one account.
    pub fn part(&self, part: LedgerPart) -> impl Iterator<Item = &LedgerLine> {
        self.lines.iter().filter(move |l| l.part == part)
    }

    /// What does not close within its bound, in words for a person: none on a sound solution.
    pub fn unclosed(&self) -> Vec<String> {
        let mut found = Vec::new();
        if self.photon_closure.abs() > 1e-12 {
            found.push(format!(
                "the account of photons misses a share of {:.1e} of them",
                self.photon_closure
            ));
        }
        if self.carrier_checked && self.carrier_closure.abs() > self.carrier_bound {
            found.push(format!(
                "the terminal current differs from the current through the edges by {:.1e} A/m2, allowed {:.1e}",
                self.carrier_closure, self.carrier_bound
            ));
        }
        if self.energy_closure.abs() > self.energy_bound {
            found.push(format!(
                "the account of free energy misses {:.1e} W/m2, allowed {:.1e}",
                self.energy_closure, self.energy_bound
            ));
        }
        found
    }

    fn add(&mut self, part: LedgerPart, place: &str, channel: &str, value: f64, source: bool) {
        self.lines.push(LedgerLine {
            part,
            place: place.to_string(),
            channel: channel.to_string(),
            value,
            source,
        });
    }
}

/// The line of what leaves at the terminals.
pub(super) const EXTRACTED: &str = "extracted";

const CHANNELS: [&str; 3] = ["Shockley-Read-Hall", "radiative", "Auger"];

/// The channels of recombination in a layer: those that all have, and one for each defect.
fn channels(layer: &Layer) -> Vec<String> {
    let defects = layer.defects.iter().map(|defect| format!("defect {}", defect.name));
    CHANNELS.iter().map(|name| name.to_string()).chain(defects).collect()
}

fn photon_lines(
    ledger: &mut Ledger,
    device: &Device,
    part: LedgerPart,
    account: &PhotonAccount<f64>,
    unit: f64,
) {
    ledger.add(part, "", "incident", account.incident * unit, true);
    ledger.add(part, "", "shaded by the grid", account.shaded * unit, false);
    ledger.add(part, "", "reflected", account.reflected * unit, false);
    ledger.add(part, "", "absorbed in the coating", account.coating * unit, false);
    for (layer, absorbed) in device.stack().layers.iter().zip(&account.absorbed) {
        ledger.add(part, &layer.name, "absorbed", absorbed * unit, false);
    }
    ledger.add(part, "", "escaped at the lit face", account.escaped * unit, false);
    ledger.add(part, "", "transmitted", account.transmitted * unit, false);
}

/// What a contact takes: pairs, and free energy with each carrier.
struct Taken {
    /// Particle flux of the carrier that the terminal current is summed with (the minority carrier, where there is one).
    rate: f64,
    /// Free energy that it loses there, per particle.
    energy: f64,
    /// Free energy lost by the other carrier, per area and time; `None` where it is pinned to the contact.
    other: Option<f64>,
}

/// What a contact takes: by its law, or by the reaction of a pinned row.
fn contact_account(problem: &Problem, point: &Point, which: usize, local: &Local) -> Taken {
    let c = &problem.coefficients;
    let system = problem.system();
    let contact = &c.contacts[which];
    let node = if which == 0 { 0 } else { c.nodes() - 1 };
    // A contact takes part with the carrier that the terminal current is summed with.
    let own = match (c.terminal_pair(), contact.majority) {
        (Some((front, _)), _) if which == 0 => front,
        (Some((_, rear)), _) => rear,
        (None, Majority::Electron) => Carrier::Hole,
        (None, _) => Carrier::Electron,
    };
    let other = if own == Carrier::Electron { Carrier::Hole } else { Carrier::Electron };
    // Free energy over the contact's: of electrons E_Fn - E_F, of holes E_F - E_Fp.
    let over = |carrier: Carrier| {
        let k = carrier as usize;
        let rear = problem.rear_level(point.state.voltage);
        let level = point.state.nodes[node][1 + k]
            + rear * (c.reference[k] - which as f64)
            + point.state.remainders[node][k];
        if carrier == Carrier::Electron { -level } else { level }
    };
    let by_other = (!contact.pins(other)).then(|| system.surface[which][other as usize].0 * over(other));
    if !contact.pins(own) {
        let energy = if contact.pins(other) { local.splitting } else { over(own) };
        return Taken { rate: system.surface[which][own as usize].0, energy, other: by_other };
    }
    let edge = if which == 0 { 0 } else { c.nodes() - 2 };
    // Leaving along the flux at the front for electrons and at the rear for holes, else against it; the half-cell's
    // own recombination is not the contact's.
    let along = (own == Carrier::Electron) == (which == 0);
    let flux = if own == Carrier::Electron { system.electron_flux[edge] } else { system.hole_flux[edge] };
    let rate = (if along { flux } else { -flux }) - system.net[node];
    Taken { rate, energy: 0.0, other: by_other }
}

/// Rounding of the current of one edge: its fluxes are right relative to themselves (the differences of the levels are
/// held beyond the last place of the levels), by the last place of the energies that their exponents are made from.
pub(super) fn edge_rounding(problem: &Problem, point: &Point, k: usize, largest_energy: f64) -> f64 {
    let system = problem.system();
    let size = |node: usize| point.state.nodes[node].iter().map(|x| x.abs()).sum::<f64>();
    let energies = size(k) + size(k + 1) + largest_energy;
    ROUNDINGS * energies * (system.electron_flux[k].abs() + system.hole_flux[k].abs())
}

/// Rounding of the account of free energy, scaled: every rate and flux holds the rounding of the energies that its exponents
/// are made from, every splitting that of two levels.
fn energy_rounding(
    problem: &Problem,
    point: &Point,
    locals: &[Local],
    interfaces: &[(usize, f64, f64)],
    surfaces: &[Taken; 2],
) -> f64 {
    let c = &problem.coefficients;
    let system = problem.system();
    let light = point.state.light;
    // Of a rate with a splitting: its own, relative, and that of the splitting. The current is a sum of rates, and the state
    // that it is summed at makes the fluxes follow it to a rounding of each: so it counts at the junction's voltage too.
    let junction = (point.state.voltage / c.thermal_voltage).abs();
    let rated = |rate: f64, splitting: f64, energies: f64, levels: f64| {
        ROUNDINGS * rate.abs() * (energies * (splitting.abs() + junction) + levels)
    };
    let mut sum = 0.0;
    let mut sizes = Vec::with_capacity(locals.len());
    for ((e, _, i), local) in c.places().zip(locals) {
        let levels = local.phi_n.abs() + local.phi_p.abs();
        let energies = point.state.nodes[i][0].abs() + levels + c.entries[e].affinity_and_gap.abs();
        let rates: f64 = local.rates.iter().map(|r| r.abs()).sum::<f64>() * c.entries[e].volume;
        sum += rated(rates, local.splitting, energies, levels)
            + rated(problem.generation[e] * light, 0.0, 0.0, levels);
        sizes.push((energies, levels));
    }
    for (l, rate, energy) in interfaces {
        let (front, rear) = (sizes[c.first[l + 1] - 1], sizes[c.first[l + 1]]);
        let (energies, levels) = (front.0.max(rear.0), front.1.max(rear.1));
        sum += rated(*rate, 0.0, energies, levels) + ROUNDINGS * energies * energy.abs();
    }
    for (which, (taken, (energies, levels))) in
        surfaces.iter().zip([sizes[0], sizes[sizes.len() - 1]]).enumerate()
    {
        sum += rated(taken.rate, taken.energy, energies, levels);
        sum += ROUNDINGS * energies * taken.other.unwrap_or(0.0).abs();
        sum += ROUNDINGS * levels * system.surface[which].iter().map(|(flux, _)| flux.abs()).sum::<f64>();
    }
    let mut by_node = vec![0.0_f64; c.nodes()];
    for ((_, _, i), (energies, _)) in c.places().zip(&sizes) {
        by_node[i] = by_node[i].max(*energies);
    }
    // Cells, and places where levels jump.
    for k in 0..c.cells.len() {
        let rise = |which: usize| (point.state.nodes[k + 1][which] - point.state.nodes[k][which]).abs();
        let transport = (system.electron_flux[k] * rise(1)).abs() + (system.hole_flux[k] * rise(2)).abs();
        sum += ROUNDINGS * (by_node[k] + by_node[k + 1]) * transport;
    }
    sum
}

/// The largest sum of the energies that a rate's exponents are made from, kT.
fn largest_energies(problem: &Problem, point: &Point) -> f64 {
    let node = |x: &[f64; 3]| x.iter().map(|x| x.abs()).sum::<f64>();
    point.state.nodes.iter().map(node).fold(0.0, f64::max)
        + problem.rear_level(point.state.voltage).abs()
        + problem.largest_energy()
}

/// Roundings of a rate or a flux, each of the size of the energies in its exponents: the potential, the level, the band's edge
/// and their sum.
const ROUNDINGS: f64 = 4.0 * f64::EPSILON;

/// The account of a solved point. The problem must have been assembled at its state.
pub(crate) fn ledger(
    device: &Device,
    illumination: &Illumination<f64>,
    problem: &Problem,
    point: &Point,
) -> Ledger {
    let c = &problem.coefficients;
    let stack = device.stack();
    let system = problem.system();
    let terminal = Terminal::new(c, system);
    let locals = locals(problem, point);
    let mut ledger = Ledger::default();
    let light = point.state.light;
    let current = scales::CURRENT;
    let power = scales::CURRENT * c.thermal_voltage;

    photon_lines(&mut ledger, device, LedgerPart::Photons, &illumination.photons, ELEMENTARY_CHARGE);
    let incident = illumination.photons.incident;
    ledger.photon_closure = if incident > 0.0 { illumination.photons.closure() / incident } else { 0.0 };
    if let Some(energy) = &illumination.energy {
        photon_lines(&mut ledger, device, LedgerPart::PhotonEnergy, energy, 1.0);
    }

    // Sums over entries, by layer.
    let layers = c.layers();
    let mut generated = vec![0.0; layers];
    let channels: Vec<Vec<String>> = stack.layers.iter().map(channels).collect();
    let mut recombined: Vec<Vec<f64>> = channels.iter().map(|names| vec![0.0; names.len()]).collect();
    let mut generated_energy = vec![0.0; layers];
    let mut recombined_energy = recombined.clone();
    let mut gap_energy = vec![0.0; layers];
    for ((e, layer, _), local) in c.places().zip(&locals) {
        let entry = &c.entries[e];
        let g = problem.generation[e] * light;
        generated[layer] += g;
        generated_energy[layer] += g * local.splitting;
        gap_energy[layer] += g * (entry.affinity_and_gap - entry.affinity);
        for (channel, rate) in local.rates.iter().chain(&local.defects).enumerate() {
            let r = rate * entry.volume;
            recombined[layer][channel] += r;
            recombined_energy[layer][channel] += r * local.splitting;
        }
    }
    let mut interfaces: Vec<(usize, f64, f64)> = c
        .interfaces
        .iter()
        .enumerate()
        .filter_map(|(l, i)| i.as_ref().map(|i| (l, i)))
        .map(|(l, i)| {
            let local = &locals[i.entry];
            let rate = interface_recombination::<f64, f64>(i, &local.side, local.splitting);
            (l, rate, rate * local.splitting)
        })
        .collect();
    for (l, source) in c.sources.iter().enumerate() {
        let acted = source.as_ref().and_then(|s| act(c, s, l, &locals).exchange);
        if let Some(u) = acted {
            // What each band loses, at its own level.
            let beside = [&locals[c.first[l + 1] - 1], &locals[c.first[l + 1]]];
            let energy: f64 =
                (0..2).map(|s| u.holes[s] * beside[s].phi_p - u.electrons[s] * beside[s].phi_n).sum();
            interfaces.push((l, u.recombination, energy));
        }
    }
    interfaces.sort_by_key(|i| i.0);
    let surfaces = [
        contact_account(problem, point, 0, &locals[0]),
        contact_account(problem, point, 1, &locals[locals.len() - 1]),
    ];

    // Carriers.
    let part = LedgerPart::Carriers;
    for (layer, g) in stack.layers.iter().zip(&generated) {
        ledger.add(part, &layer.name, "generation", g * current, true);
    }
    for ((layer, names), rates) in stack.layers.iter().zip(&channels).zip(&recombined) {
        for (channel, r) in names.iter().zip(rates) {
            ledger.add(part, &layer.name, channel, r * current, false);
        }
    }
    let between = |l: usize| format!("{} / {}", stack.layers[l].name, stack.layers[l + 1].name);
    for (l, rate, _) in &interfaces {
        ledger.add(part, &between(*l), "interface recombination", rate * current, false);
    }
    for (name, taken) in ["front contact", "rear contact"].into_iter().zip(&surfaces) {
        ledger.add(part, name, "surface recombination", taken.rate * current, false);
    }
    // Pairs that part to the two contacts; where both ends pin the same carrier, current takes none.
    let delivered = if terminal.from_rows { -terminal.sense * terminal.current } else { 0.0 };
    ledger.add(part, "", EXTRACTED, delivered * current, false);

    // Free energy.
    let part = LedgerPart::FreeEnergy;
    let mut balance = CompensatedSum::<f64>::new();
    let sources: f64 = generated_energy.iter().sum();
    for (layer, g) in stack.layers.iter().zip(&generated_energy) {
        ledger.add(part, &layer.name, "free energy generated", g * power, true);
        balance.add(*g);
    }
    for ((layer, names), rates) in stack.layers.iter().zip(&channels).zip(&recombined_energy) {
        for (channel, r) in names.iter().zip(rates) {
            ledger.add(part, &layer.name, channel, r * power, false);
            balance.add(-r);
        }
    }
    for (l, _, energy) in &interfaces {
        ledger.add(part, &between(*l), "interface recombination", energy * power, false);
        balance.add(-energy);
    }
    for (name, taken) in ["front contact", "rear contact"].into_iter().zip(&surfaces) {
        ledger.add(part, name, "surface recombination", taken.rate * taken.energy * power, false);
        balance.add(-(taken.rate * taken.energy));
        if let Some(energy) = taken.other {
            ledger.add(part, name, "passage into the contact", energy * power, false);
            balance.add(-energy);
        }
    }
    // Flux times the fall of the level, over a cell or where levels jump.
    let transport = |k: usize| {
        let (a, b) = (&point.state.nodes[k], &point.state.nodes[k + 1]);
        let (low_a, low_b) = (&point.state.remainders[k], &point.state.remainders[k + 1]);
        [
            system.electron_flux[k] * ((b[1] - a[1]) + (low_b[0] - low_a[0])),
            system.hole_flux[k] * ((b[2] - a[2]) + (low_b[1] - low_a[1])),
        ]
    };
    let mut lines = Vec::with_capacity(layers);
    for layer in 0..layers {
        let (mut electrons, mut holes) = (0.0, 0.0);
        for e in c.first[layer]..c.first[layer + 1] - 1 {
            let lost = transport(c.node(layer, e));
            electrons -= lost[0];
            holes -= lost[1];
        }
        lines.push((stack.layers[layer].name.clone(), electrons, holes));
    }
    for (layer, node) in c.joint_nodes() {
        let lost = transport(node);
        lines.push((between(layer), -lost[0], -lost[1]));
    }
    for (place, electrons, holes) in lines {
        ledger.add(part, &place, "electron transport", electrons * power, false);
        ledger.add(part, &place, "hole transport", holes * power, false);
        balance.add(-electrons);
        balance.add(-holes);
    }
    let junction_voltage = point.state.voltage / c.thermal_voltage;
    let device_power = -terminal.current * junction_voltage;
    balance.add(-device_power);
    let device_power = device_power * power;
    let shunt = problem.shunt_conductance * point.state.voltage * point.state.voltage;
    let series = problem.series_resistance * point.current * point.current;
    if problem.shunt_conductance > 0.0 {
        ledger.add(part, "", "shunt resistance", shunt, false);
    }
    let diode =
        problem.second_diode.map_or(0.0, |diode| diode.current(point.state.voltage).0 * point.state.voltage);
    if problem.second_diode.is_some() {
        ledger.add(part, "", "second diode", diode, false);
    }
    if problem.series_resistance > 0.0 {
        ledger.add(part, "", "series resistance", series, false);
    }
    ledger.add(part, "", "delivered to the terminals", device_power - shunt - diode - series, false);
    ledger.energy_closure = balance.value() * power;
    let rounding = energy_rounding(problem, point, &locals, &interfaces, &surfaces)
        + f64::EPSILON * terminal.magnitude * junction_voltage.abs();
    // What the last update leaves is its square.
    let left = f64::EPSILON.max(point.last_update * point.last_update) * balance.magnitude();
    ledger.energy_bound = (left + rounding) * power;

    // The photon side of it.
    if let Some(absorbed) = &illumination.photon_energy {
        let part = LedgerPart::PhotonEnergy;
        let absorbed: f64 = absorbed.iter().sum::<f64>() * light;
        let gaps = gap_energy.iter().sum::<f64>() * power;
        ledger.add(part, "", "of it above the gap, to heat", absorbed - gaps, false);
        ledger.add(part, "", "of it gap less splitting", gaps - sources * power, false);
        ledger.add(part, "", "of it free energy generated", sources * power, false);
    }

    // The current of the best-conditioned edge, evaluated from the carriers there and nothing else.
    let energy = problem.largest_energy();
    let best = (0..c.cells.len())
        .filter(|k| c.cells[*k].width > 0.0)
        .map(|k| (k, edge_rounding(problem, point, k, energy)))
        .min_by(|a, b| a.1.total_cmp(&b.1));
    if let Some((k, rounding)) = best {
        let edge = -c.polarity * (system.electron_flux[k] + system.hole_flux[k]);
        // Every term of the sum holds the rounding of its own energies, and the fluxes what the last iteration left.
        let own =
            ROUNDINGS * largest_energies(problem, point) * terminal.magnitude + point.flux_error / current;
        ledger.carrier_closure = (terminal.current - edge) * current;
        ledger.carrier_bound = (1e-9 * terminal.current.abs() + rounding + own) * current;
        ledger.carrier_checked = terminal.from_rows && rounding < 1e-3 * terminal.magnitude;
    }
    ledger
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: the bounds that the ledger itself states; each account is put out of balance by hand.
    #[test]
    fn what_does_not_close_is_said() {
        let sound = Ledger {
            carrier_bound: 1e-9,
            carrier_closure: 1e-10,
            carrier_checked: true,
            energy_bound: 1e-10,
            ..Ledger::default()
        };
        assert_eq!(sound.unclosed(), Vec::<String>::new());
        let photons = Ledger { photon_closure: -1e-9, ..sound.clone() };
        let carriers = Ledger { carrier_closure: -2e-9, ..sound.clone() };
        let energy = Ledger { energy_closure: 2e-10, ..sound.clone() };
        for (ledger, word) in
            [(photons, "photons"), (carriers.clone(), "terminal current"), (energy, "free energy")]
        {
            let said = ledger.unclosed();
            assert!(said.len() == 1 && said[0].contains(word), "{said:?}");
        }
        assert!(Ledger { carrier_checked: false, ..carriers }.unclosed().is_empty());
    }
}
