//! Coherent films at normal incidence: what a coating reflects and what it absorbs itself.

use crate::math::Scalar;

use super::complex::Complex;
use super::reflectance::{Film, OpticalConstants, Reflectance};

/// What happens to light at the lit face before it is in the first semiconductor: shares of the light that
/// falls beside the grid.
#[derive(Clone, Copy, Debug)]
pub struct FaceShares<P> {
    /// Share reflected to the outside.
    pub reflected: P,
    /// Share absorbed in the films of a coating.
    pub coating: P,
    /// Whether every table of constants that was used covers the wavelength; beyond a table its end value is used.
    pub covered: bool,
}

/// Refractive index `n` and extinction coefficient `k` at a wavelength.
#[derive(Clone, Copy, Debug)]
pub struct Index<P> {
    /// Refractive index.
    pub n: P,
    /// Extinction coefficient.
    pub k: P,
    /// Whether the table behind it covers the wavelength.
    pub covered: bool,
}

impl OpticalConstants {
    /// Index at a vacuum wavelength, m: linear between the points of the table, constant beyond them.
    ///
    /// `None` for a table without points or with columns of different length.
    pub fn at(&self, wavelength: f64) -> Option<Index<f64>> {
        let place = Place::of(&self.wavelength, wavelength)?;
        Some(Index { n: place.value(&self.n)?, k: place.value(&self.k)?, covered: place.covered })
    }
}

/// A place in a table with increasing abscissas.
struct Place {
    low: usize,
    high: usize,
    fraction: f64,
    covered: bool,
}

impl Place {
    /// Where `x` lies in `grid`; at an end for values beyond it. `None` for an empty grid.
    fn of(grid: &[f64], x: f64) -> Option<Place> {
        let last = grid.len().checked_sub(1)?;
        let covered = x >= grid[0] && x <= grid[last];
        let above = grid.partition_point(|&g| g <= x);
        if above == 0 || above > last {
            let end = if above == 0 { 0 } else { last };
            return Some(Place { low: end, high: end, fraction: 0.0, covered });
        }
        let (low, high) = (above - 1, above);
        Some(Place { low, high, fraction: (x - grid[low]) / (grid[high] - grid[low]), covered })
    }
    /// The table's value there.
    fn value<P: Scalar>(&self, values: &[P]) -> Option<P> {
        let (low, high) = (*values.get(self.low)?, *values.get(self.high)?);
        Some(low + (high - low) * self.fraction)
    }
}

impl<P: Scalar> Reflectance<P> {
    /// Whether it needs the index of the first semiconductor.
    pub fn needs_index(&self) -> bool {
        matches!(self, Reflectance::Coating(_))
    }

    /// Shares reflected and absorbed at the lit face, at a vacuum wavelength in m.
    ///
    /// `first` is the index of the first semiconductor there, needed by a coating alone. `None` when it is
    /// missing or a table is empty or ragged.
    pub fn at(&self, wavelength: f64, first: Option<Index<P>>) -> Option<FaceShares<P>> {
        let zero = P::constant(0.0);
        match self {
            Reflectance::Number(value) => {
                Some(FaceShares { reflected: *value, coating: zero, covered: true })
            }
            Reflectance::Table { wavelength: grid, reflectance } => {
                let place = Place::of(grid, wavelength)?;
                Some(FaceShares {
                    reflected: place.value(reflectance)?,
                    coating: zero,
                    covered: place.covered,
                })
            }
            Reflectance::Coating(films) => coating(films, wavelength, first?),
        }
    }
}

/// Reflectance and absorption of coherent films, outermost first, between vacuum and a semiconductor.
///
/// Normal incidence, complex indices `n + i k`, waves as `e^(i(2 pi N z / wavelength - omega t))`. From the
/// semiconductor outwards, each face adds to the amplitudes below it
/// `r = (r1 + r' e^(2 i delta)) / (1 + r1 r' e^(2 i delta))`, `t = t1 t' e^(i delta) / (1 + r1 r' e^(2 i delta))`,
/// with `delta = 2 pi N d / wavelength` of the film between and Fresnel's `r1`, `t1` of the face; nothing in it
/// grows with thickness. Light that enters: `n_s |t|^2`; the films absorb the rest. Standard thin-film optics
/// (M. Born and E. Wolf, Principles of Optics, section 1.6, from memory).
fn coating<P: Scalar>(films: &[Film<P>], wavelength: f64, first: Index<P>) -> Option<FaceShares<P>> {
    let mut covered = first.covered;
    let mut absorbing = false;
    let mut below = Complex::new(first.n, first.k);
    // Amplitudes seen from inside the film above `below`; none yet.
    let mut amplitudes: Option<(Complex<P>, Complex<P>, Complex<P>)> = None;
    for film in films.iter().rev() {
        let index = film.constants.at(wavelength)?;
        covered &= index.covered;
        absorbing |= index.k != 0.0;
        let here = Complex::new(P::constant(index.n), P::constant(index.k));
        let (r, t) = join(here, below, amplitudes);
        let delta = here.scale(film.thickness * (2.0 * std::f64::consts::PI / wavelength));
        amplitudes = Some((r, t, delta.exp_i()));
        below = here;
    }
    let (r, t) = join(Complex::real(1.0), below, amplitudes);
    let reflected = r.norm_squared();
    let zero = P::constant(0.0);
    let rest = -(reflected + t.norm_squared() * first.n) + 1.0;
    let coating = if absorbing { rest.max(zero) } else { zero };
    Some(FaceShares { reflected, coating, covered })
}

/// Amplitudes of the face between two media, joined with those of all that lies behind the lower medium, a film
/// of phase factor `e^(i delta)`.
fn join<P: Scalar>(
    above: Complex<P>,
    below: Complex<P>,
    behind: Option<(Complex<P>, Complex<P>, Complex<P>)>,
) -> (Complex<P>, Complex<P>) {
    let sum = (above + below).recip();
    let (r1, t1) = ((above - below) * sum, (above + above) * sum);
    let Some((r, t, phase)) = behind else { return (r1, t1) };
    let back = r * phase * phase;
    let scale = (Complex::real(1.0) + r1 * back).recip();
    ((r1 + back) * scale, t1 * t * phase * scale)
}

#[cfg(test)]
mod tests;
