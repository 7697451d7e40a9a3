//! How strongly a material absorbs, and its refractive index: tables moved to the gap wanted, analytic edges, single numbers.

mod constants;
mod emission;
mod films;
mod models;
mod table;
#[cfg(test)]
mod tests;

use std::sync::Arc;

use crate::math::Scalar;
use crate::math::cache::Cache;
use crate::quantity::constants::{ELEMENTARY_CHARGE, LIGHT_SPEED, PLANCK};

use super::material::{Material, MaterialBase, MaterialError};
use super::parameter::Parameter;
use super::record::{OpticalModel, Origin};

pub use constants::OpticalConstants;
pub use emission::equilibrium_emission;
pub use films::{film_constants, film_names};
use table::Table;

/// Photon energy in eV times vacuum wavelength in m.
pub(crate) const ENERGY_TIMES_WAVELENGTH: f64 = PLANCK * LIGHT_SPEED / ELEMENTARY_CHARGE;

/// An absorption coefficient at one wavelength.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Absorption<P> {
    /// The coefficient, m^-1; 0 where it is not known.
    pub coefficient: P,
    /// Whether the material's data cover the wavelength.
    pub covered: bool,
}

/// A complex refractive index at one wavelength.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Refraction<P> {
    /// Refractive index; beyond the table's ends its end value.
    pub n: P,
    /// Extinction coefficient.
    pub k: P,
    /// Whether the table of refractive indices covers the wavelength.
    pub covered: bool,
}

/// What an absorption coefficient rests on.
#[derive(Clone, Debug, PartialEq)]
pub enum AbsorptionBasis {
    /// One number set by the script (or the default 0 of a custom material).
    Number,
    /// A table of the script's.
    OwnTable,
    /// A published table, with a stated edge where it has none.
    Table,
    /// Two tables of neighbouring compositions (one beyond the last), moved to the gap wanted and mixed.
    BetweenTables {
        /// Composition of the tables used.
        compositions: Vec<f64>,
    },
    /// A stated model for want of a table.
    Model,
    /// Nothing: light above the gap is refused.
    Unknown,
}

/// A table moved in energy, with its share.
#[derive(Clone, Debug)]
struct Shifted<P> {
    table: Arc<Table>,
    /// eV.
    shift: P,
    share: P,
}

/// Absorption growing with the square of the energy above an indirect edge.
#[derive(Clone, Debug)]
struct IndirectTail<P> {
    /// m^-1 eV^-2.
    strength: f64,
    /// eV.
    edge: P,
    /// The energy that it grows up to, eV; `None` for ever.
    until: Option<P>,
}

/// A material's absorption at one place and temperature, ready for any wavelength.
#[derive(Clone, Debug)]
pub struct Absorber<P> {
    number: Option<P>,
    /// eV.
    gap: P,
    tables: Vec<Shifted<P>>,
    tail: Option<IndirectTail<P>>,
    /// Whether the tables are the library's, which live as long as the program.
    library: bool,
}

/// All that an absorption spectrum of library tables depends on: where the tables lie in memory, for ever, and the bits of
/// every number.
type SpectrumKey = (Vec<usize>, Vec<u64>);

/// Spectra of a few hundred layers, of some 30 kB each.
static SPECTRA: Cache<SpectrumKey, Vec<Absorption<f64>>> = Cache::new(256);

impl<P: Scalar> Absorber<P> {
    /// The key of this absorber's spectrum; `None` where it may not be remembered.
    fn key(&self, wavelengths: &[f64]) -> Option<SpectrumKey> {
        let plain = size_of::<P>() == size_of::<f64>();
        if !plain || !self.library || self.tables.is_empty() || self.number.is_some() {
            return None;
        }
        let tables = self.tables.iter().map(|t| Arc::as_ptr(&t.table).addr()).collect();
        let until = |t: &IndirectTail<P>| t.until.map_or(f64::INFINITY, |until| until.value());
        let tail = self.tail.iter().flat_map(|t| [t.strength, t.edge.value(), until(t)]);
        let numbers = self.tables.iter().flat_map(|t| [t.shift.value(), t.share.value()]).chain(tail);
        Some((tables, numbers.chain(wavelengths.iter().copied()).map(f64::to_bits).collect()))
    }

    /// The absorption coefficient at a vacuum wavelength, m.
    ///
    /// A single number acts at photon energies from the gap up. Outside its table a material is taken as transparent and
    /// the wavelength as not covered; below an analytic edge it is transparent and covered.
    pub fn at(&self, wavelength: f64) -> Absorption<P> {
        self.evaluate(wavelength, &mut [0, 0])
    }

    /// The same at many vacuum wavelengths, m; fastest where they increase or decrease.
    pub fn spectrum(&self, wavelengths: &[f64]) -> Vec<Absorption<P>> {
        let evaluate = || {
            let mut hints = [0, 0];
            wavelengths.iter().map(move |&w| self.evaluate(w, &mut hints))
        };
        let Some(key) = self.key(wavelengths) else { return evaluate().collect() };
        // Only numbers without derivatives have a key.
        let plain = |a: Absorption<P>| Absorption { coefficient: a.coefficient.value(), covered: a.covered };
        let known = SPECTRA.get(key, || evaluate().map(plain).collect());
        let lift =
            |a: &Absorption<f64>| Absorption { coefficient: P::constant(a.coefficient), covered: a.covered };
        known.iter().map(lift).collect()
    }

    fn evaluate(&self, wavelength: f64, hints: &mut [usize; 2]) -> Absorption<P> {
        self.coefficient(P::constant(ENERGY_TIMES_WAVELENGTH / wavelength), wavelength, hints)
    }

    /// The coefficient at a photon energy, eV, and the vacuum wavelength, m, of its real part.
    fn coefficient(&self, energy: P, wavelength: f64, hints: &mut [usize; 2]) -> Absorption<P> {
        let zero = P::constant(0.0);
        if let Some(number) = self.number {
            let coefficient = if energy.value() >= self.gap.value() { number } else { zero };
            return Absorption { coefficient, covered: true };
        }
        let covered = self.tables.iter().all(|t| t.table.covers(wavelength));
        if !covered || self.tables.is_empty() {
            return Absorption { coefficient: zero, covered: false };
        }
        let mut sum = zero;
        for (shifted, hint) in self.tables.iter().zip(hints) {
            sum = sum + shifted.table.coefficient(energy - shifted.shift, hint) * shifted.share;
        }
        if let Some(tail) = &self.tail {
            let reached = tail.until.map_or(energy, |until| energy.min(until));
            let above = (reached - tail.edge).max(zero);
            sum = sum + above * above * tail.strength;
        }
        Absorption { coefficient: sum, covered }
    }

    /// Refractive index and absorption coefficient, m^-1, at a photon energy, eV, that may have derivatives; `None` without a
    /// table.
    fn at_energy(&self, energy: P) -> Option<(P, P)> {
        if self.tables.is_empty() {
            return None;
        }
        let (mut n, mut hints) = (P::constant(0.0), [0, 0]);
        for shifted in &self.tables {
            n = n + shifted.table.index(energy - shifted.shift)? * shifted.share;
        }
        let wavelength = ENERGY_TIMES_WAVELENGTH / energy.value();
        Some((n, self.coefficient(energy, wavelength, &mut hints).coefficient))
    }

    /// Refractive index and extinction coefficient at a vacuum wavelength, m; `None` without a table.
    pub fn refraction(&self, wavelength: f64) -> Option<Refraction<P>> {
        if self.tables.is_empty() {
            return None;
        }
        let energy = ENERGY_TIMES_WAVELENGTH / wavelength;
        let mut n = P::constant(0.0);
        for shifted in &self.tables {
            n = n + shifted.table.index(-shifted.shift + energy)? * shifted.share;
        }
        let k = self.at(wavelength).coefficient * (wavelength / (4.0 * std::f64::consts::PI));
        let covered = self.tables.iter().all(|t| t.table.index_covers(wavelength));
        Some(Refraction { n, k, covered })
    }
}

impl<P: Scalar> Material<P> {
    /// The material's absorption at one place: composition there if the layer grades it, temperature in K.
    ///
    /// An `absorption` set by the script goes before its table, its table before the library's. Library tables move with
    /// the gap: with temperature, composition and a `gap` set by the script. The script's own table stands, unless the
    /// script gives the gap a temperature model: then it moves with the gap, from the reference temperature.
    ///
    /// # Errors
    /// As [`Material::values`].
    pub fn absorber(&self, x: Option<P>, temperature: P) -> Result<Absorber<P>, MaterialError> {
        let values = self.bare_values(x, temperature, P::constant(0.0))?;
        self.absorber_at(x, temperature, values.gap)
    }

    /// [`Material::absorber`] where the gap, J, is known already.
    pub(super) fn absorber_at(
        &self,
        x: Option<P>,
        temperature: P,
        gap: P,
    ) -> Result<Absorber<P>, MaterialError> {
        let gap = gap * (1.0 / ELEMENTARY_CHARGE);
        let zero = P::constant(0.0);
        let mut number = self.overrides.get(&Parameter::Absorption).copied();
        let (mut tables, mut tail) = (Vec::new(), None);
        match (&self.optical, &self.base) {
            (Some(own), _) => {
                let table = Arc::new(Table::from_constants(own));
                let shift = self.set_gap_change(temperature) * (1.0 / ELEMENTARY_CHARGE);
                tables.push(Shifted { table, shift, share: P::constant(1.0) });
            }
            (None, MaterialBase::Library(_)) => {
                let (record, x) = self.record(x)?;
                let moved = match self.set_value(Parameter::Gap, temperature) {
                    Some(gap) => gap * (1.0 / ELEMENTARY_CHARGE) - record.bands(x, temperature).gap,
                    None => zero,
                };
                (tables, tail) = models::tables(record, x, temperature, moved);
            }
            (None, MaterialBase::Custom(_)) => number = number.or(Some(zero)),
        }
        Ok(Absorber { number, gap, tables, tail, library: self.optical.is_none() })
    }

    /// The absorption coefficient at a vacuum wavelength, m; see [`Material::absorber`], which serves many wavelengths.
    ///
    /// # Errors
    /// As [`Material::values`].
    pub fn absorption(
        &self,
        x: Option<P>,
        temperature: P,
        wavelength: f64,
    ) -> Result<Absorption<P>, MaterialError> {
        Ok(self.absorber(x, temperature)?.at(wavelength))
    }

    /// Refractive index and extinction coefficient at a vacuum wavelength, m; `None` for a material without a table.
    ///
    /// # Errors
    /// As [`Material::values`].
    pub fn refraction(
        &self,
        x: Option<P>,
        temperature: P,
        wavelength: f64,
    ) -> Result<Option<Refraction<P>>, MaterialError> {
        Ok(self.absorber(x, temperature)?.refraction(wavelength))
    }

    /// What the absorption rests on, with its source for a person.
    pub fn absorption_basis(&self, x: Option<P>) -> (AbsorptionBasis, Origin, String) {
        if self.overrides.contains_key(&Parameter::Absorption) {
            return (AbsorptionBasis::Number, Origin::Script, "set by the script".to_string());
        }
        if let Some(own) = &self.optical {
            return (AbsorptionBasis::OwnTable, Origin::Script, own.source.clone());
        }
        match self.record(x) {
            Ok((record, x)) => {
                let source = record.optics.source().to_string();
                match record.optics {
                    OpticalModel::None => (AbsorptionBasis::Unknown, Origin::Illustrative, source),
                    OpticalModel::AlInP | OpticalModel::GaInAs | OpticalModel::Phosphide => {
                        (AbsorptionBasis::Model, Origin::Illustrative, source)
                    }
                    OpticalModel::AlGaAs => {
                        let compositions = models::compositions(x.value());
                        match compositions.len() {
                            1 if compositions[0] == x.value() => {
                                (AbsorptionBasis::Table, Origin::Published, source)
                            }
                            _ => (AbsorptionBasis::BetweenTables { compositions }, Origin::Published, source),
                        }
                    }
                    _ => (AbsorptionBasis::Table, Origin::Published, source),
                }
            }
            Err(_) => (AbsorptionBasis::Number, Origin::Script, "not set: transparent".to_string()),
        }
    }
}
