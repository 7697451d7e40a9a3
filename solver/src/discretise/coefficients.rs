//! The coefficients of the discrete equations: a device on a mesh.

use crate::device::{Contact, Device, Offset, Stack, Transport};
use crate::materials::Values;
use crate::math::{Over, Scalar};
use crate::mesh::Mesh;
use crate::physics::Statistics;
use crate::physics::shockley_read_hall::Level;
use crate::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE, VACUUM_PERMITTIVITY};

use super::contact::{Carrier, ContactLaw, Majority};
use super::interface::{Joint, Source, at_level, level_depth};
use super::scales;
use super::special::{Prepared, Special};

/// One side of a node: the material there and the half control volumes that belong to it.
#[derive(Clone, Copy, Debug)]
pub struct Entry<P> {
    /// Control volume per area.
    pub volume: P,
    /// Electron affinity over kT.
    pub affinity: P,
    /// Affinity plus gap over kT.
    pub affinity_and_gap: P,
    /// ln Nc.
    pub ln_conduction: P,
    /// ln Nv.
    pub ln_valence: P,
    /// Donors minus acceptors, as far as they are always ionised.
    pub doping: P,
    /// The Shockley-Read-Hall level.
    pub level: Level<P>,
    /// Radiative coefficient.
    pub radiative: P,
    /// Auger coefficient C_n.
    pub electron_auger: P,
    /// Auger coefficient C_p.
    pub hole_auger: P,
}

impl<P: Scalar> Entry<P> {
    /// The real parts.
    pub fn plain(&self) -> Entry<f64> {
        Entry {
            volume: self.volume.value(),
            affinity: self.affinity.value(),
            affinity_and_gap: self.affinity_and_gap.value(),
            ln_conduction: self.ln_conduction.value(),
            ln_valence: self.ln_valence.value(),
            doping: self.doping.value(),
            level: Level {
                electron_rate: self.level.electron_rate.value(),
                hole_rate: self.level.hole_rate.value(),
                n1: self.level.n1.value(),
                p1: self.level.p1.value(),
            },
            radiative: self.radiative.value(),
            electron_auger: self.electron_auger.value(),
            hole_auger: self.hole_auger.value(),
        }
    }
}

/// A cell between two nodes.
#[derive(Clone, Copy, Debug)]
pub struct Cell<P> {
    /// Permittivity over width: displacement per potential difference.
    pub displacement: P,
    /// Diffusion coefficient of electrons over width.
    pub electron: P,
    /// Diffusion coefficient of holes over width.
    pub hole: P,
    /// Width.
    pub width: P,
}

/// Recombination at an interface: a level with velocities in place of rates, and the entry whose carriers it sees.
#[derive(Clone, Copy, Debug)]
pub struct InterfaceRecombination<P> {
    /// The level.
    pub level: Level<P>,
    /// The entry on the side of the smaller gap.
    pub entry: usize,
}

/// A device on a mesh: all that the residual needs but the state, the bias and the generation.
#[derive(Clone, Debug)]
pub struct Coefficients<P> {
    /// Carrier statistics.
    pub statistics: Statistics,
    /// Thermal voltage kT/q, V.
    pub thermal_voltage: P,
    /// Sides of nodes, front first: `[entries]`. Layer `l` holds entries `first[l]..first[l + 1]`; an entry `e` of
    /// layer `l` belongs to [`Coefficients::node`]`(l, e)`.
    pub entries: Vec<Entry<P>>,
    /// First entry of each layer, and the number of entries: `[layers + 1]`.
    pub first: Vec<usize>,
    /// What entries have beyond the common equations, by entry; most devices have none.
    pub special: Vec<Special<P>>,
    /// Number of defects of each layer: `[layers]`.
    pub defects: Vec<usize>,
    /// How many of the interfaces before each layer have continuous levels, and so one node for two entries: `[layers]`.
    pub shared: Vec<usize>,
    /// Cells; cell `i` lies between nodes `i` and `i + 1`: `[nodes - 1]`. Between the two nodes of a joint it has no width, and a
    /// displacement per potential difference without limit.
    pub cells: Vec<Cell<P>>,
    /// Depth of each entry, m: `[entries]`.
    pub depths: Vec<P>,
    /// Recombination at the rear end of each layer: `[layers - 1]`.
    pub interfaces: Vec<Option<InterfaceRecombination<P>>>,
    /// The law of each interface at which levels may jump; two nodes stand there, which share their potential: `[layers - 1]`.
    pub joints: Vec<Option<Joint<P>>>,
    /// Charge and recombination with the carriers of both sides at each interface: `[layers - 1]`.
    pub sources: Vec<Option<Source<P>>>,
    /// Contacts: front and rear.
    pub contacts: [ContactLaw<P>; 2],
    /// +1 where the rear contact is the positive terminal (p side), -1 where the front one is.
    pub polarity: f64,
    /// Whether the outermost dopings make a junction.
    pub junction: bool,
    /// How much of the rear contact's level (0 or 1) is the reference of the electrons' and of the holes' stored
    /// quasi-Fermi potential: each refers to the contact that pins it as the majority, so that it is stored as zero there.
    pub reference: [f64; 2],
}

/// The sign of the rear contact as a terminal, and whether there is a junction.
///
/// The neutral materials at the ends decide; where they are of one type and a contact holds a barrier, the end whose
/// barrier for electrons is the higher one is the p side.
fn sides<P: Scalar>(contacts: &[ContactLaw<P>; 2]) -> (f64, bool) {
    let [front, rear] = contacts;
    match (front.neutral, rear.neutral) {
        (Majority::Electron, Majority::Hole) => (1.0, true),
        (Majority::Hole, Majority::Electron) => (-1.0, true),
        _ if !front.barrier && !rear.barrier => (-1.0, false),
        _ => {
            let (at_front, at_rear) = (front.potential.value(), rear.potential.value());
            if at_front > at_rear { (1.0, true) } else { (-1.0, at_front < at_rear) }
        }
    }
}

/// What is there of an entry.
fn find<P>(special: &[Special<P>], entry: usize) -> Option<&Special<P>> {
    special.binary_search_by_key(&entry, |s| s.entry).ok().map(|at| &special[at])
}

/// Values at one place, in the scaled form of an entry (volume left at zero).
fn entry<P: Scalar>(v: &Values<P>, doping: P, thermal_energy: P) -> Entry<P> {
    let per_kt = thermal_energy.recip();
    let gap = v.gap * per_kt;
    let affinity = v.affinity * per_kt;
    let ln_conduction = (v.conduction_density * (1.0 / scales::DENSITY)).ln();
    let ln_valence = (v.valence_density * (1.0 / scales::DENSITY)).ln();
    let ln_intrinsic = (ln_conduction + ln_valence - gap) * 0.5;
    let trap = v.trap_energy * per_kt;
    Entry {
        volume: P::constant(0.0),
        affinity,
        affinity_and_gap: affinity + gap,
        ln_conduction,
        ln_valence,
        doping: doping * (1.0 / scales::DENSITY),
        level: Level {
            electron_rate: v.electron_lifetime.recip() * scales::TIME,
            hole_rate: v.hole_lifetime.recip() * scales::TIME,
            n1: (ln_intrinsic + trap).exp(),
            p1: (ln_intrinsic - trap).exp(),
        },
        radiative: v.radiative_coefficient * (scales::DENSITY * scales::TIME),
        electron_auger: v.electron_auger * (scales::DENSITY * scales::DENSITY * scales::TIME),
        hole_auger: v.hole_auger * (scales::DENSITY * scales::DENSITY * scales::TIME),
    }
}

/// What the affinity behind an interface moves by, over kT, so that the bands line up as given; `rear` has not moved.
fn aligned<P: Scalar>(offset: &Offset<P>, front: &Entry<P>, rear: &Entry<P>, thermal_energy: P) -> P {
    let per_kt = thermal_energy.recip();
    match offset {
        Offset::Conduction(rise) => front.affinity - *rise * per_kt - rear.affinity,
        Offset::Valence(rise) => front.affinity_and_gap - *rise * per_kt - rear.affinity_and_gap,
        Offset::Share(share) => {
            let gaps = (rear.affinity_and_gap - rear.affinity) - (front.affinity_and_gap - front.affinity);
            front.affinity - *share * gaps - rear.affinity
        }
    }
}

impl<P: Scalar + Over<P>> Coefficients<P> {
    /// The coefficients of a device on a mesh.
    pub fn new(device: &Device<P>, mesh: &Mesh) -> Self {
        let stack: &Stack<P> = device.stack();
        let thermal_energy = stack.temperature * BOLTZMANN;
        let thermal_voltage = thermal_energy * (1.0 / ELEMENTARY_CHARGE);
        let displacement_scale = thermal_voltage
            * (VACUUM_PERMITTIVITY / (ELEMENTARY_CHARGE * scales::DENSITY * scales::LENGTH * scales::LENGTH));
        let diffusion_scale = thermal_voltage * (scales::TIME / (scales::LENGTH * scales::LENGTH));
        let mut entries = Vec::with_capacity(mesh.entries());
        let mut depths = Vec::with_capacity(mesh.entries());
        let mut special: Vec<Special<P>> = Vec::new();
        let mut cells: Vec<Cell<P>> = Vec::with_capacity(mesh.nodes() - 1);
        let mut first = vec![0];
        let mut gaps = Vec::new();
        let mut front = P::constant(0.0);
        let (mut shared, mut joints) = (Vec::with_capacity(stack.layers.len()), Vec::new());
        let mut continuous = 0;
        // What the affinities of a layer and of all behind it have moved by, over kT.
        let mut shift: Option<P> = None;
        for (index, layer) in stack.layers.iter().enumerate() {
            let fractions = &mesh.layers[index].fractions;
            let prepared = Prepared::new(layer, stack.temperature, || device.values(index, P::constant(0.0)));
            let place = |fraction: f64| {
                let z = layer.thickness * fraction;
                let donors = layer.donors.at(z, layer.thickness);
                let acceptors = layer.acceptors.at(z, layer.thickness);
                let doping = match &prepared {
                    Some(prepared) => prepared.ionised(donors, acceptors),
                    None => (donors, acceptors),
                };
                (device.values(index, z), doping.0 - doping.1)
            };
            let uniform =
                layer.composition.is_none() && layer.donors.is_constant() && layer.acceptors.is_constant();
            let everywhere = uniform.then(|| place(0.0));
            let at = |fraction: f64| everywhere.unwrap_or_else(|| place(fraction));
            let base = entries.len();
            let law = index.checked_sub(1).and_then(|i| stack.interfaces[i].as_ref()).map(|i| &i.transport);
            if matches!(law, Some(Transport::Thermionic { .. })) {
                let none = P::constant(0.0);
                cells.push(Cell {
                    displacement: P::constant(f64::INFINITY),
                    electron: none,
                    hole: none,
                    width: none,
                });
            }
            let mut previous: Option<(f64, usize)> = None;
            for &fraction in fractions {
                let (values, doping) = at(fraction);
                entries.push(entry(&values, doping, thermal_energy));
                depths.push(front + layer.thickness * fraction);
                let here = entries.len() - 1;
                let of_layer = prepared.as_ref();
                special.extend(of_layer.map(|p| p.at(here, layer.thickness * fraction, &values)));
                if let Some((before, e)) = previous {
                    let width = layer.thickness * ((fraction - before) * (1.0 / scales::LENGTH));
                    let (middle, _) = at(0.5 * (fraction + before));
                    let per_width = width.recip();
                    cells.push(Cell {
                        displacement: middle.permittivity * displacement_scale * per_width,
                        electron: middle.electron_mobility * diffusion_scale * per_width,
                        hole: middle.hole_mobility * diffusion_scale * per_width,
                        width,
                    });
                    let half = width * 0.5;
                    entries[e].volume = entries[e].volume + half;
                    entries[here].volume = entries[here].volume + half;
                }
                previous = Some((fraction, here));
            }
            let before = index.checked_sub(1).and_then(|i| stack.interfaces[i].as_ref());
            if let Some(offset) = before.and_then(|i| i.offset.as_ref()) {
                shift = Some(aligned(offset, &entries[base - 1], &entries[base], thermal_energy));
            }
            if let Some(shift) = shift {
                for e in &mut entries[base..] {
                    (e.affinity, e.affinity_and_gap) = (e.affinity + shift, e.affinity_and_gap + shift);
                }
            }
            if index > 0 {
                let joint = before.and_then(|i| {
                    Joint::new(&i.transport, &entries[base - 1], &entries[base], stack.temperature)
                });
                if joint.is_none() {
                    continuous += 1;
                }
                joints.push(joint);
            }
            shared.push(continuous);
            let gap = |e: usize| (entries[e].affinity_and_gap - entries[e].affinity).value();
            gaps.push((gap(base), gap(entries.len() - 1)));
            first.push(entries.len());
            front = front + layer.thickness;
        }
        let velocity_scale = scales::TIME / scales::LENGTH;
        let interfaces = stack
            .interfaces
            .iter()
            .enumerate()
            .map(|(l, interface)| {
                interface.as_ref().and_then(|i| {
                    let (s_n, s_p) = (i.electron_recombination_velocity, i.hole_recombination_velocity);
                    if s_n.value() == 0.0 || s_p.value() == 0.0 || i.both_sides || i.states.is_some() {
                        return None;
                    }
                    // The side of the smaller gap; the rear one where they are equal.
                    let entry = if gaps[l].1 < gaps[l + 1].0 { first[l + 1] - 1 } else { first[l + 1] };
                    let e: &Entry<P> = &entries[entry];
                    let (n1, p1) = match &i.level {
                        None => {
                            let gap = e.affinity_and_gap - e.affinity;
                            let intrinsic = ((e.ln_conduction + e.ln_valence - gap) * 0.5).exp();
                            (intrinsic, intrinsic)
                        }
                        Some(level) => at_level(e, level_depth(level, e, thermal_energy)),
                    };
                    Some(InterfaceRecombination {
                        level: Level {
                            electron_rate: s_n * velocity_scale,
                            hole_rate: s_p * velocity_scale,
                            n1,
                            p1,
                        },
                        entry,
                    })
                })
            })
            .collect();
        let sources = stack
            .interfaces
            .iter()
            .enumerate()
            .map(|(l, interface)| {
                let (front, rear) = (&entries[first[l + 1] - 1], &entries[first[l + 1]]);
                let narrow = if gaps[l].1 < gaps[l + 1].0 { front } else { rear };
                interface.as_ref().and_then(|i| Source::new(i, front, rear, narrow, thermal_energy))
            })
            .collect();
        let law = |e: usize, contact: &Contact<P>| {
            let own = find(&special, e);
            let scaled = |v| v * velocity_scale;
            ContactLaw::new(stack.statistics, &entries[e], own, contact, stack.temperature, scaled)
        };
        let contacts = [law(0, &stack.front), law(entries.len() - 1, &stack.rear)];
        let (polarity, junction) = sides(&contacts);
        let reference = match (contacts[0].neutral, contacts[1].neutral) {
            (Majority::Hole, _) | (_, Majority::Electron) => [1.0, 0.0],
            _ => [0.0, 1.0],
        };
        // A carrier that the rear contact does not pin refers to the front: so the bias enters its rows through the rear
        // contact's law alone, not through sums of fluxes that cancel (which a weak tie to the contact would feel).
        let pinned = [Carrier::Electron, Carrier::Hole].map(|carrier| contacts[1].pins(carrier));
        let reference = [0, 1].map(|k| if pinned[k] { reference[k] } else { 0.0 });
        Coefficients {
            statistics: stack.statistics,
            thermal_voltage,
            entries,
            first,
            shared,
            special,
            defects: stack.layers.iter().map(|layer| layer.defects.len()).collect(),
            cells,
            depths,
            interfaces,
            joints,
            sources,
            contacts,
            polarity,
            junction,
            reference,
        }
    }

    /// What an entry has beyond the common equations.
    pub fn special(&self, entry: usize) -> Option<&Special<P>> {
        find(&self.special, entry)
    }

    /// Number of nodes.
    pub fn nodes(&self) -> usize {
        self.cells.len() + 1
    }
    /// Number of layers.
    pub fn layers(&self) -> usize {
        self.first.len() - 1
    }
    /// The node of an entry of a layer (of the layer's last entry but one: that after the layer's last node).
    #[inline(always)]
    pub fn node(&self, layer: usize, entry: usize) -> usize {
        entry - self.shared[layer]
    }
    /// The layer and node of each entry, in order.
    pub fn places(&self) -> impl Iterator<Item = (usize, usize, usize)> + '_ {
        (0..self.layers())
            .flat_map(move |l| (self.first[l]..self.first[l + 1]).map(move |e| (e, l, self.node(l, e))))
    }
    /// Whether levels may jump at the rear end of a layer, and two nodes stand there.
    pub fn is_joint(&self, layer: usize) -> bool {
        self.joints.get(layer).is_some_and(Option::is_some)
    }
    /// The front node of each joint, in order, with the layer before it.
    pub fn joint_nodes(&self) -> impl Iterator<Item = (usize, usize)> + '_ {
        (0..self.joints.len()).filter(|l| self.is_joint(*l)).map(|l| (l, self.node(l, self.first[l + 1] - 1)))
    }
    /// The carrier whose flux into the front contact, and the one whose flux into the rear contact, sum with the net
    /// recombination to the terminal current: minority carriers at both. `None` where both ends pin the same one.
    ///
    /// A majority carrier that a contact does not pin serves too: its flux is the contact's law.
    pub fn terminal_pair(&self) -> Option<(Carrier, Carrier)> {
        let [front, rear] = &self.contacts;
        match (front.majority, rear.majority) {
            (Majority::Hole, Majority::Electron | Majority::Both) | (Majority::Both, Majority::Electron) => {
                Some((Carrier::Electron, Carrier::Hole))
            }
            (Majority::Electron, Majority::Hole | Majority::Both) | (Majority::Both, Majority::Hole) => {
                Some((Carrier::Hole, Carrier::Electron))
            }
            (Majority::Both, Majority::Both) => None,
            (Majority::Electron, Majority::Electron) | (Majority::Hole, Majority::Hole) => {
                [(Carrier::Electron, Carrier::Hole), (Carrier::Hole, Carrier::Electron)]
                    .into_iter()
                    .find(|(a, b)| front.tells(*a) && rear.tells(*b))
            }
        }
    }
}
