//! `epiloom materials`: the built-in library with ranges and sources.

use epiloom_solver::materials::{Kind, Listing, MaterialError, Provenance, library, listing, names};
use epiloom_solver::quantity::constants::ELEMENTARY_CHARGE;

use crate::diagnostics::{Diagnostic, codes, suggest};

use super::columns::{Align, columns, wrapped};
use super::exit::Exit;
use super::output::Output;
use crate::figure_text::{significant, unit_symbol};

/// `epiloom materials [NAME]`.
#[derive(clap::Args, Debug)]
pub struct Materials {
    /// The material; without one all are listed
    pub name: Option<String>,
    /// Composition of an alloy to list the values at
    #[arg(long, value_name = "X", requires = "name")]
    pub x: Option<f64>,
}

impl Materials {
    /// Lists them.
    pub fn run(&self, output: &mut Output) -> Exit {
        let Some(name) = &self.name else {
            output.result(&all());
            return Exit::Done;
        };
        match listing(name, self.x) {
            Ok(listing) => {
                output.result(&page(&listing, output.width().min(110)));
                Exit::Done
            }
            Err(error) => {
                let fault = match error {
                    MaterialError::Unknown { .. } => {
                        let help = match suggest(name, names()) {
                            Some(near) => format!("did you mean `{near}`?"),
                            None => format!("the library has {}", names().collect::<Vec<_>>().join(", ")),
                        };
                        Diagnostic::new(codes::UNKNOWN_MATERIAL, error.to_string()).help(help)
                    }
                    _ => Diagnostic::new(codes::COMPOSITION, error.to_string()),
                };
                output.diagnostic(&fault, None);
                Exit::Usage
            }
        }
    }
}

fn electron_volts(energy: f64) -> String {
    significant(energy / ELEMENTARY_CHARGE, 5)
}

/// One line for each material.
fn all() -> String {
    let head = ["material", "x", "gap", "valence band", "conduction band", "what it is"];
    let mut rows = vec![head.map(str::to_string).to_vec()];
    for listing in library() {
        rows.push(vec![
            listing.name.to_string(),
            listing.at.map_or_else(String::new, |x| significant(x, 3)),
            format!("{} eV", electron_volts(listing.values.gap)),
            format!("{} eV", electron_volts(listing.valence_offset)),
            format!("{} eV", electron_volts(listing.conduction_offset)),
            listing.description.to_string(),
        ]);
    }
    let align = [Align::Left, Align::Left, Align::Right, Align::Right, Align::Right];
    format!(
        "{}\nAt 298.15 K, undoped. Band edges are counted upwards from those of GaAs.\n",
        columns(&rows, &align, 0)
    )
}

/// All of one material.
fn page(listing: &Listing, width: usize) -> String {
    let mut text = format!("{}: {}\n", listing.name, listing.description);
    if let (Some((low, high)), Some(at)) = (listing.composition, listing.at) {
        let (low, high, at) = (significant(low, 3), significant(high, 3), significant(at, 3));
        text.push_str(&format!("alloy of composition x from {low} to {high}; values at x = {at}\n"));
    }
    text.push_str("at 298.15 K, undoped\n\n");
    for (value, provenance) in &listing.rows {
        let (number, unit) = in_trade_unit(*value, provenance.parameter.kind());
        let number = if number.is_finite() { significant(number, 5) } else { "infinite".to_string() };
        let unit = unit_symbol(unit);
        let (low, high) = provenance.temperature;
        let (low, high) = (significant(low, 4), significant(high, 4));
        let value = format!("{}  {number} {unit}", provenance.parameter.key());
        text.push_str(&format!("{}, valid from {low} to {high} K\n", value.trim_end()));
        text.push_str(&wrapped(&source(provenance), width, 4));
    }
    let valence = electron_volts(listing.valence_offset);
    let conduction = electron_volts(listing.conduction_offset);
    text.push_str(&format!(
        "\nband edges above those of GaAs  valence {valence} eV, conduction {conduction} eV\n"
    ));
    text.push_str(&wrapped(&source(&listing.offset), width, 4));
    if let Some(coefficient) = listing.radiative_by_absorption {
        let (number, unit) = in_trade_unit(coefficient, Kind::RadiativeCoefficient);
        let (number, unit) = (significant(number, 4), unit_symbol(unit));
        text.push_str(&format!(
            "\nradiative_coefficient with radiative_model: \"absorption\"  {number} {unit}\n{}",
            wrapped("detailed balance: W. van Roosbroeck and W. Shockley, Phys. Rev. 94, 1558 (1954), with the absorption below", width, 4)
        ));
    }
    if let Some(coefficients) = &listing.narrowing {
        text.push_str("\ngap narrowing, off unless gap_narrowing: \"jain\"\n");
        for (word, roots) in ["donors", "acceptors"].iter().zip(coefficients) {
            let [cube, fourth, square] = roots.map(|e| significant(e * 1e3, 4));
            let law = format!(
                "{cube} r^(1/3) + {fourth} r^(1/4) + {square} r^(1/2) meV, r the net doping over 1e18 cm^-3"
            );
            text.push_str(&wrapped(&format!("{word}: {law}"), width, 4));
        }
        text.push_str(&wrapped(listing.narrowing_source, width, 4));
    }
    text.push_str(&format!("\nabsorption\n{}", wrapped(listing.absorption, width, 4)));
    text
}

/// The source, with how well it is known where it does not say so itself.
fn source(provenance: &Provenance) -> String {
    let origin = provenance.origin.word();
    if provenance.source.contains(origin) {
        provenance.source.to_string()
    } else {
        format!("{origin}: {}", provenance.source)
    }
}

/// A value of this kind in the unit that the trade uses, and that unit.
fn in_trade_unit(value: f64, kind: Kind) -> (f64, &'static str) {
    match kind {
        Kind::Energy => (value / ELEMENTARY_CHARGE, "eV"),
        Kind::Number => (value, ""),
        Kind::Density => (value / 1e6, "per_cm3"),
        Kind::Mobility => (value * 1e4, "cm2_per_Vs"),
        Kind::Time => (value * 1e9, "ns"),
        Kind::RadiativeCoefficient => (value * 1e6, "cm3_per_s"),
        Kind::AugerCoefficient => (value * 1e12, "cm6_per_s"),
        Kind::InverseLength => (value / 100.0, "per_cm"),
        Kind::Temperature => (value, "K"),
        Kind::EnergyPerTemperature => (value / ELEMENTARY_CHARGE, "eV_per_K"),
        Kind::ArealDensity => (value / 1e4, "per_cm2"),
    }
}
