//! The spectral generation operator: photons absorbed in each control volume for each photon that falls on the stack.

use std::ops::Mul;

use sprs::CsMatI;

use crate::math::Scalar;

/// How a layer absorbs at each wavelength.
#[derive(Clone, Debug)]
pub enum Absorption<P> {
    /// Not at all.
    Inert,
    /// The same throughout the layer, m^-1: `[wavelengths]`.
    Uniform(Vec<P>),
    /// By cell, m^-1: `[wavelengths][cells]`, cells from the front.
    Cells(Vec<Vec<P>>),
}

/// A layer as the light sees it.
#[derive(Clone, Debug)]
pub struct OpticalLayer<P> {
    /// Half widths of its cells, m, from the front: `[cells]`. Its entries are the `cells + 1` nodes that bound
    /// them; each entry owns the halves beside it inside the layer.
    pub half_widths: Vec<P>,
    /// How it absorbs.
    pub absorption: Absorption<P>,
}

/// Shares of the light that falls on the stack, by where it goes before and instead of being absorbed in a layer.
///
/// With the shares absorbed in the layers they add up to 1.
#[derive(Clone, Copy, Debug)]
pub struct Shares<P> {
    /// Falls on the grid.
    pub shaded: P,
    /// Reflected at the lit face from outside.
    pub reflected: P,
    /// Absorbed in the films of the coating.
    pub coating: P,
    /// Leaves at the far face.
    pub transmitted: P,
    /// Leaves again at the lit face, from inside.
    pub escaped: P,
}

/// What the light meets outside the layers.
#[derive(Clone, Debug)]
pub struct Faces<P> {
    /// Whether the light enters at the rear, and so passes the layers last to first.
    pub from_rear: bool,
    /// Share of the area under the grid.
    pub shading: P,
    /// Reflectance of the lit face from outside, and share absorbed in its coating: `[wavelengths]`.
    pub entrance: Vec<(P, P)>,
    /// Reflectance of the far face from inside.
    pub far_reflectance: P,
    /// Reflectance of the lit face from inside.
    pub internal_reflectance: P,
}

/// Photons absorbed in each control volume (entry) for each photon that falls on the stack, by wavelength.
///
/// A sparse matrix, entries by wavelengths, stored by wavelength. Each element is the exact difference of the
/// flux over the control volume, `flux (1 - e^(-alpha h))` by `expm1`, summed over all passes between the faces:
/// with transmission `T` of the whole stack, the passes in each direction are one geometric series of ratio
/// `r_far r_internal T^2`. Entries that light does not reach (below 1e-60 of it) are not stored.
#[derive(Clone, Debug)]
pub struct GenerationOperator<P> {
    matrix: CsMatI<P, u32, usize>,
    destinations: Destinations<P>,
}

/// Where light of each wavelength goes, as shares of what falls on the stack.
#[derive(Clone, Debug)]
pub struct Destinations<P> {
    shares: Vec<Shares<P>>,
    absorbed: Vec<P>,
    layers: usize,
}

impl<P> Destinations<P> {
    /// Shares of the light that no layer absorbs: `[wavelengths]`.
    pub fn shares(&self) -> &[Shares<P>] {
        &self.shares
    }
    /// Share absorbed in each layer at a wavelength: `[layers]`; empty beyond the last wavelength.
    pub fn absorbed(&self, wavelength: usize) -> &[P] {
        self.absorbed.get(wavelength * self.layers..(wavelength + 1) * self.layers).unwrap_or(&[])
    }
}

/// Follows light of each wavelength through the layers and gives the photons absorbed in consecutive entries to
/// `absorb`, as (wavelength, first entry, photons absorbed in it and the following per photon falling on the stack).
///
/// Every entry comes at most once for a wavelength, in increasing order; those that do not come absorb nothing.
pub fn follow<P: Scalar>(
    layers: &[OpticalLayer<P>],
    faces: &Faces<P>,
    mut absorb: impl FnMut(usize, usize, &[P]),
) -> Destinations<P> {
    let mut pass = Pass::new(layers, faces.from_rear);
    let mut shares = Vec::with_capacity(faces.entrance.len());
    let mut absorbed = vec![P::constant(0.0); faces.entrance.len() * layers.len()];
    for (w, &(reflected, coating)) in faces.entrance.iter().enumerate() {
        let lit = -faces.shading + 1.0;
        let entered = lit * (-(reflected + coating) + 1.0);
        let sums = &mut absorbed[w * layers.len()..(w + 1) * layers.len()];
        let (transmitted, escaped) =
            pass.column(layers, faces, w, entered, sums, |first, values| absorb(w, first, values));
        shares.push(Shares {
            shaded: faces.shading,
            reflected: lit * reflected,
            coating: lit * coating,
            transmitted,
            escaped,
        });
    }
    Destinations { shares, absorbed, layers: layers.len() }
}

/// Light weaker than this share of what fell on the stack is followed no further.
const FAINTEST: f64 = 1e-60;

impl<P: Scalar> GenerationOperator<P> {
    /// Builds the operator for layers (front first) and faces; as many wavelengths as `faces.entrance` has.
    ///
    /// A layer whose absorption lacks a wavelength or a cell is transparent there.
    pub fn new(layers: &[OpticalLayer<P>], faces: &Faces<P>) -> Self {
        let entries: usize = layers.iter().map(|layer| layer.half_widths.len() + 1).sum();
        let wavelengths = faces.entrance.len();
        let mut columns = Columns {
            starts: vec![0; wavelengths + 1],
            entries: Vec::with_capacity(wavelengths * entries),
            values: Vec::with_capacity(wavelengths * entries),
        };
        let destinations = follow(layers, faces, |w, first, values| columns.append(w, first, values));
        // A wavelength that nothing absorbs ends where the one before it ended.
        for w in 0..wavelengths {
            columns.starts[w + 1] = columns.starts[w + 1].max(columns.starts[w]);
        }
        let matrix =
            CsMatI::try_new_csc((entries, wavelengths), columns.starts, columns.entries, columns.values)
                // Cannot fail: starts and entries increase by construction. The empty matrix keeps the shape.
                .unwrap_or_else(|_| CsMatI::zero((wavelengths, entries)).transpose_into());
        GenerationOperator { matrix, destinations }
    }

    /// The matrix: entries by wavelengths, photons absorbed per photon falling on the stack.
    pub fn matrix(&self) -> &CsMatI<P, u32, usize> {
        &self.matrix
    }
    /// Shares of the light that no layer absorbs: `[wavelengths]`.
    pub fn shares(&self) -> &[Shares<P>] {
        self.destinations.shares()
    }
    /// Share absorbed in each layer at a wavelength: `[layers]`; empty beyond the last wavelength.
    pub fn absorbed(&self, wavelength: usize) -> &[P] {
        self.destinations.absorbed(wavelength)
    }

    /// Sum over wavelengths of the operator times one number each: with the photon flux of each wavelength,
    /// m^-2 s^-1, the pairs generated per area and second in each control volume: `[entries]`.
    pub fn apply<Q: Copy>(&self, per_wavelength: &[Q]) -> Vec<P>
    where
        P: Mul<Q, Output = P>,
    {
        let mut sum = vec![P::constant(0.0); self.matrix.rows()];
        for (column, &factor) in self.matrix.outer_iterator().zip(per_wavelength) {
            for (&entry, &value) in column.indices().iter().zip(column.data()) {
                let slot = &mut sum[entry as usize];
                *slot = *slot + value * factor;
            }
        }
        sum
    }

    /// Sum over entries of the operator times one number each: with the share of pairs collected from each
    /// control volume, the quantum efficiency: `[wavelengths]`.
    pub fn apply_transposed<Q: Copy>(&self, per_entry: &[Q]) -> Vec<P>
    where
        P: Mul<Q, Output = P>,
    {
        let sum_of = |column: sprs::CsVecViewI<'_, P, u32>| {
            let terms = column.indices().iter().zip(column.data());
            terms.fold(P::constant(0.0), |sum, (&entry, &value)| match per_entry.get(entry as usize) {
                Some(&factor) => sum + value * factor,
                None => sum,
            })
        };
        self.matrix.outer_iterator().map(sum_of).collect()
    }
}

/// The columns of the matrix as they grow.
struct Columns<P> {
    starts: Vec<usize>,
    entries: Vec<u32>,
    values: Vec<P>,
}

impl<P: Scalar> Columns<P> {
    /// Appends the elements of consecutive entries from `first` on to the column of a wavelength, but not its zeros.
    fn append(&mut self, wavelength: usize, first: usize, values: &[P]) {
        let zeros = values.iter().fold(0u32, |count, v| count + u32::from(v.value() == 0.0));
        let entries = (first as u32)..;
        if zeros == 0 || !plain::<P>() {
            self.entries.extend(entries.take(values.len()));
            self.values.extend_from_slice(values);
        } else {
            for (entry, &value) in entries.zip(values).filter(|(_, v)| v.value() != 0.0) {
                self.entries.push(entry);
                self.values.push(value);
            }
        }
        self.starts[wavelength + 1] = self.values.len();
    }
}

/// Sum in four interleaved parts: a quarter of the chain of dependent additions.
fn sum_of<P: Scalar>(values: &[P]) -> P {
    let mut parts = [P::constant(0.0); 4];
    let mut chunks = values.chunks_exact(4);
    for chunk in &mut chunks {
        for (part, &value) in parts.iter_mut().zip(chunk) {
            *part = *part + value;
        }
    }
    for (part, &value) in parts.iter_mut().zip(chunks.remainder()) {
        *part = *part + value;
    }
    (parts[0] + parts[1]) + (parts[2] + parts[3])
}

/// The way of the light through the cells, with its working memory.
struct Pass<P> {
    /// Layers in the order of the light, each with its first entry in that order.
    order: Vec<(usize, usize)>,
    /// Half widths of all cells in the order of the light, negative, with a gap after each layer.
    minus_half_widths: Vec<P>,
    entries: usize,
    from_rear: bool,
    /// Share absorbed in each half of a cell.
    absorbed: Vec<P>,
    /// Photons absorbed per entry for a unit flux entering at the lit face, and at the far face.
    forward: Vec<P>,
    backward: Vec<P>,
    /// Layers that absorb anything at this wavelength.
    active: Vec<bool>,
}

/// Whether numbers of this kind carry no derivatives, so that a zero is nothing but zero.
const fn plain<P>() -> bool {
    size_of::<P>() == size_of::<f64>()
}

impl<P: Scalar> Pass<P> {
    fn new(layers: &[OpticalLayer<P>], from_rear: bool) -> Self {
        let zero = P::constant(0.0);
        let mut order = Vec::with_capacity(layers.len());
        let mut widths = Vec::new();
        let numbers: Vec<usize> =
            if from_rear { (0..layers.len()).rev().collect() } else { (0..layers.len()).collect() };
        for layer in numbers {
            order.push((layer, widths.len()));
            let cells = &layers[layer].half_widths;
            if from_rear {
                widths.extend(cells.iter().rev().map(|&h| -h));
            } else {
                widths.extend(cells.iter().map(|&h| -h));
            }
            widths.push(zero); // a layer has one more entry than cells: keeps cells and entries in step
        }
        let entries = widths.len();
        Pass {
            order,
            minus_half_widths: widths,
            entries,
            from_rear,
            absorbed: vec![zero; entries],
            forward: vec![zero; entries],
            backward: vec![zero; entries],
            active: vec![false; layers.len()],
        }
    }

    /// Fills the share absorbed in each half cell at wavelength `w`.
    fn halves(&mut self, layers: &[OpticalLayer<P>], w: usize) {
        let zero = P::constant(0.0);
        for (&(layer, start), active) in self.order.iter().zip(&mut self.active) {
            let cells = layers[layer].half_widths.len();
            let out = &mut self.absorbed[start..start + cells];
            let widths = &self.minus_half_widths[start..start + cells];
            *active = match &layers[layer].absorption {
                Absorption::Inert => false,
                Absorption::Uniform(values) => match values.get(w) {
                    Some(&alpha) if !plain::<P>() || alpha.value() != 0.0 => {
                        for (a, &h) in out.iter_mut().zip(widths) {
                            *a = h * alpha;
                        }
                        true
                    }
                    _ => false,
                },
                Absorption::Cells(values) => match values.get(w) {
                    Some(alphas) => {
                        let alpha = |c: usize| {
                            let c = if self.from_rear { cells - 1 - c } else { c };
                            alphas.get(c).copied().unwrap_or(zero)
                        };
                        for (c, (a, &h)) in out.iter_mut().zip(widths).enumerate() {
                            *a = h * alpha(c);
                        }
                        true
                    }
                    None => false,
                },
            };
            if *active {
                P::exp_m1_all(out);
                for a in out {
                    *a = -*a;
                }
            }
        }
    }

    /// Sends a unit flux through all layers, from the lit face (`backward` false) or from the far face, and
    /// returns what comes out at the other end.
    fn send(&mut self, layers: &[OpticalLayer<P>], backward: bool) -> P {
        let zero = P::constant(0.0);
        let mut flux = P::constant(1.0);
        let count = self.order.len();
        for position in 0..count {
            let position = if backward { count - 1 - position } else { position };
            let (layer, start) = self.order[position];
            if !self.active[position] {
                continue;
            }
            let cells = layers[layer].half_widths.len();
            let shares = &self.absorbed[start..start + cells];
            if backward {
                let out = &mut self.backward[start..=start + cells];
                let mut carry = zero;
                for (c, &a) in shares.iter().enumerate().rev() {
                    let (first, second, left) = cross(flux, a);
                    out[c + 1] = carry + first;
                    carry = second;
                    flux = left;
                    if faint(flux) {
                        out[..c].fill(zero);
                        out[c] = carry;
                        carry = out[0];
                        flux = zero;
                        break;
                    }
                }
                out[0] = carry;
            } else {
                let out = &mut self.forward[start..=start + cells];
                let mut carry = zero;
                for (c, &a) in shares.iter().enumerate() {
                    let (first, second, left) = cross(flux, a);
                    out[c] = carry + first;
                    carry = second;
                    flux = left;
                    if faint(flux) {
                        out[c + 1..].fill(zero);
                        out[c + 1] = carry;
                        carry = out[cells];
                        flux = zero;
                        break;
                    }
                }
                out[cells] = carry;
            }
        }
        flux
    }

    /// One wavelength: gives its column to `absorb` and fills the sums per layer; returns the shares transmitted and
    /// escaped.
    fn column(
        &mut self,
        layers: &[OpticalLayer<P>],
        faces: &Faces<P>,
        w: usize,
        entered: P,
        sums: &mut [P],
        mut absorb: impl FnMut(usize, &[P]),
    ) -> (P, P) {
        let zero = P::constant(0.0);
        self.halves(layers, w);
        let end = self.send(layers, false);
        let mut total = zero;
        for (&(layer, start), &active) in self.order.iter().zip(&self.active) {
            if active {
                sums[layer] = sum_of(&self.forward[start..=start + layers[layer].half_widths.len()]);
                total = total + sums[layer];
            }
        }
        // What is not absorbed gets through: by difference while that is exact enough, so that photons balance.
        let through = if end.value() > 1e-6 { -total + 1.0 } else { end };
        let far = faces.far_reflectance;
        let loop_reflectance = far * faces.internal_reflectance;
        // 1 - r r' T^2, written so that nothing cancels in a weakly absorbing stack between mirrors.
        let lost = (-loop_reflectance + 1.0) + loop_reflectance * (total * (through + 1.0));
        if lost.value() <= 0.0 {
            // A cavity without any loss: light that cannot stay cannot have entered. Nothing absorbs: all sums are 0.
            return (zero, entered);
        }
        let forward = entered * lost.recip();
        let backward = forward * through * far;
        let returns = !plain::<P>() || backward.value() > FAINTEST;
        for sum in sums.iter_mut() {
            *sum = *sum * forward;
        }
        if returns {
            self.send(layers, true);
            for (&(layer, start), &active) in self.order.iter().zip(&self.active) {
                if active {
                    let entries = start..=start + layers[layer].half_widths.len();
                    sums[layer] = sums[layer] + sum_of(&self.backward[entries]) * backward;
                }
            }
        }
        let count = self.order.len();
        for position in 0..count {
            let position = if self.from_rear { count - 1 - position } else { position };
            if !self.active[position] {
                continue;
            }
            let (layer, start) = self.order[position];
            let range = start..start + layers[layer].half_widths.len() + 1;
            let values = &mut self.forward[range.clone()];
            if returns {
                for (value, &back) in values.iter_mut().zip(&self.backward[range.clone()]) {
                    *value = *value * forward + back * backward;
                }
            } else {
                for value in values.iter_mut() {
                    *value = *value * forward;
                }
            }
            if self.from_rear {
                values.reverse();
                absorb(self.entries - range.end, values);
            } else {
                absorb(start, values);
            }
        }
        let transmitted = forward * through * (-far + 1.0);
        let escaped = backward * through * (-faces.internal_reflectance + 1.0);
        (transmitted, escaped)
    }
}

/// A flux crossing a cell whose halves each absorb the share `a`: absorbed in the first half, in the second, left over.
#[inline(always)]
fn cross<P: Scalar>(flux: P, a: P) -> (P, P, P) {
    let through = -a + 1.0;
    (flux * a, flux * (through * a), flux * (through * through))
}

/// Whether light is too weak to follow.
#[inline(always)]
fn faint<P: Scalar>(flux: P) -> bool {
    plain::<P>() && flux.value() < FAINTEST
}

#[cfg(test)]
mod tests;
