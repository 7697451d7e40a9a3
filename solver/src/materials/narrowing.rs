//! Narrowing of the gap by heavy doping: what the crowd of majority carriers and the dopants' charges do to the band edges.
//!
//! `dE = A N^(1/3) + B N^(1/4) + C N^(1/2)`, N the net doping: exchange, correlation with minority carriers, and scattering
//! by ionised dopants. Source of the form: S. C. Jain, J. M. McGregor and D. J. Roulston, J. Appl. Phys. 68, 3747 (1990),
//! seen in an abstract. It is the shrinkage of the gap itself, which belongs with Fermi-Dirac statistics: what optical or
//! electrical experiments find by Boltzmann statistics holds the filling of the band already, with the opposite sign.

use crate::math::{Num, Scalar};
use crate::quantity::constants::ELEMENTARY_CHARGE;

use super::choice::Choice;
use super::material::{Dopants, Material, MaterialError, Values};
use super::parameter::Parameter;
use super::record::Origin;

/// Coefficients of N^(1/3), N^(1/4) and N^(1/2), as printed: eV, N in cm^-3.
type Roots = [f64; 3];

/// Coefficients of one material.
#[derive(Debug)]
pub(super) struct Coefficients {
    /// Name in the library; of alloys the lattice-matched one, which takes no composition.
    material: &'static str,
    donors: Roots,
    acceptors: Roots,
}

/// From memory: S. C. Jain, J. M. McGregor and D. J. Roulston, J. Appl. Phys. 68, 3747 (1990); the first of p-type InP is
/// confirmed by a collection of material data.
const JAIN: [Coefficients; 3] = [
    Coefficients {
        material: "GaAs",
        donors: [16.5e-9, 2.39e-7, 91.4e-12],
        acceptors: [9.77e-9, 3.87e-7, 3.41e-12],
    },
    Coefficients {
        material: "InP",
        donors: [17.2e-9, 2.62e-7, 98.4e-12],
        acceptors: [10.3e-9, 4.43e-7, 3.38e-12],
    },
    Coefficients {
        material: "GaInAs",
        donors: [15.5e-9, 1.95e-7, 159e-12],
        acceptors: [9.2e-9, 3.57e-7, 3.65e-12],
    },
];

/// Where [`JAIN`] comes from.
pub(super) const SOURCE: &str = "S. C. Jain, J. M. McGregor and D. J. Roulston, J. Appl. Phys. 68, 3747 (1990): the form through an \
    abstract, coefficients from memory; near 300 K, 1e16 to 1e20 cm^-3. For n-type InP another measurement gives 22.5e-9 eV cm \
    N^(1/3), a fifth of it (M. Bugajski and W. Lewandowski, J. Appl. Phys. 57, 521 (1985), second-hand)";

/// Density that a script's coefficients are the narrowing at, m^-3.
const REFERENCE: f64 = 1e24;

/// The smallest gap that narrowing may leave, J.
const LEAST_GAP: f64 = 0.05 * ELEMENTARY_CHARGE;

/// Powers of the density that the coefficients multiply, over [`REFERENCE`]; a floor of 1 m^-3 keeps slopes finite.
fn powers<P: Num>(density: P) -> [P; 3] {
    let ratio = density.max(P::constant(1.0)) * (1.0 / REFERENCE);
    [ratio.powf(1.0 / 3.0), ratio.powf(0.25), ratio.sqrt()]
}

/// What the coefficients as printed come to at [`REFERENCE`], J.
fn at_reference(roots: &Roots) -> [f64; 3] {
    let factors: [f64; 3] = powers(REFERENCE * 1e18);
    // In cm^-3 the reference is 1e18, the density at which these powers are taken relative to 1 cm^-3.
    std::array::from_fn(|i| roots[i] * factors[i] * ELEMENTARY_CHARGE)
}

/// The coefficients of a material of the library by the majority dopant (donors, acceptors), eV at a net doping of 1e18 cm^-3.
pub(super) fn listed(material: &str) -> Option<[[f64; 3]; 2]> {
    let found = JAIN.iter().find(|c| c.material == material)?;
    Some([&found.donors, &found.acceptors].map(|roots| at_reference(roots).map(|e| e / ELEMENTARY_CHARGE)))
}

/// Names of the materials with coefficients.
pub fn narrowing_materials() -> impl Iterator<Item = &'static str> {
    JAIN.iter().map(|c| c.material)
}

impl<P: Scalar> Material<P> {
    /// What the script's coefficients are, J at 1e18 cm^-3; `None` where it gives none.
    fn given_narrowing(&self) -> Option<[P; 3]> {
        use Parameter::{NarrowingCubeRoot, NarrowingFourthRoot, NarrowingSquareRoot};
        let given = [NarrowingCubeRoot, NarrowingFourthRoot, NarrowingSquareRoot]
            .map(|parameter| self.overrides.get(&parameter).copied());
        let any = given.iter().any(Option::is_some);
        any.then(|| given.map(|value| value.unwrap_or(P::constant(0.0))))
    }

    /// Whether its gap depends on doping.
    pub fn narrows(&self) -> bool {
        match self.choices.get(&Choice::GapNarrowing) {
            Some(&"off") => false,
            Some(_) => true,
            None => self.given_narrowing().is_some(),
        }
    }

    /// Whether its narrowing is by the library's coefficients.
    pub fn narrows_by_library(&self) -> bool {
        self.narrows() && self.given_narrowing().is_none()
    }

    /// How well the narrowing is known, with its source; `None` where there is none.
    pub fn narrowing_source(&self) -> Option<(Origin, &'static str)> {
        if !self.narrows() {
            None
        } else if self.given_narrowing().is_some() {
            Some((Origin::Script, "set by the script"))
        } else {
            Some((Origin::FromMemory, SOURCE))
        }
    }

    /// Narrowing of the gap, J, at a net doping (donors less acceptors), m^-3; zero where it is off.
    pub fn gap_narrowing(&self, dopants: Dopants<P>) -> P {
        if !self.narrows() {
            return P::constant(0.0);
        }
        let net = dopants.donors - dopants.acceptors;
        let coefficients = self.given_narrowing().or_else(|| {
            let found = JAIN.iter().find(|c| c.material == self.name())?;
            let roots = if net.value() < 0.0 { &found.acceptors } else { &found.donors };
            Some(at_reference(roots).map(P::constant))
        });
        let Some(coefficients) = coefficients else { return P::constant(0.0) };
        let powers = powers(net.abs());
        coefficients[0] * powers[0] + coefficients[1] * powers[1] + coefficients[2] * powers[2]
    }

    /// Moves the band edges: the conduction band falls by its share of the narrowing, the valence band rises by the rest.
    pub(super) fn narrow(&self, values: &mut Values<P>, dopants: Dopants<P>) -> Result<(), MaterialError> {
        if !self.narrows() {
            return Ok(());
        }
        let narrowing = self.gap_narrowing(dopants);
        let share = self.overrides.get(&Parameter::NarrowingShare).copied().unwrap_or(P::constant(0.5));
        values.gap = values.gap - narrowing;
        values.affinity = values.affinity + narrowing * share;
        // Not `<`: a narrowing that is not a number is refused too.
        if values.gap.value() >= LEAST_GAP {
            return Ok(());
        }
        Err(MaterialError::NarrowedAway {
            material: self.name().to_string(),
            narrowing: narrowing.value(),
            doping: (dopants.donors - dopants.acceptors).abs().value(),
        })
    }

    /// What is wrong with the script's choice of narrowing.
    pub(super) fn narrowing_faults(&self) -> Vec<MaterialError> {
        let material = self.name().to_string();
        let chosen = self.choices.get(&Choice::GapNarrowing).copied();
        let given =
            [Parameter::NarrowingCubeRoot, Parameter::NarrowingFourthRoot, Parameter::NarrowingSquareRoot];
        let given = given.into_iter().find(|p| self.overrides.contains_key(p));
        let share = self.overrides.contains_key(&Parameter::NarrowingShare);
        let first = Choice::GapNarrowing.key();
        let mut faults = Vec::new();
        match (chosen, given) {
            (Some("jain"), Some(second)) => {
                faults.push(MaterialError::Exclusive { material, first, second: second.key() });
            }
            (Some("jain"), None) if self.composition.is_some() || listed(&material).is_none() => {
                faults.push(MaterialError::NoNarrowing { material });
            }
            (None, None) if share => {
                let parameter = Parameter::NarrowingShare.key();
                faults.push(MaterialError::Needs { material, parameter, needs: first });
            }
            _ => {}
        }
        faults
    }
}

#[cfg(test)]
mod tests;
