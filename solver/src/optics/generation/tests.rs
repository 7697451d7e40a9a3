use super::*;
use crate::math::Dual;

/// Layers of a few cells with graded widths, and absorption by layer at each wavelength.
fn layers(thickness: &[f64], cells: usize, alphas: &[Vec<f64>]) -> Vec<OpticalLayer<f64>> {
    let build = |(&d, alpha): (&f64, &Vec<f64>)| {
        // Widths grow by 3 % from cell to cell: no two halves of different cells are equal.
        let weights: Vec<f64> = (0..cells).map(|c| 1.03f64.powi(c as i32)).collect();
        let total: f64 = weights.iter().sum();
        OpticalLayer {
            half_widths: weights.iter().map(|w| 0.5 * d * w / total).collect(),
            absorption: Absorption::Uniform(alpha.clone()),
        }
    };
    thickness.iter().zip(alphas).map(build).collect()
}

fn faces(wavelengths: usize, far: f64, internal: f64) -> Faces<f64> {
    Faces {
        from_rear: false,
        shading: 0.04,
        entrance: vec![(0.07, 0.02); wavelengths],
        far_reflectance: far,
        internal_reflectance: internal,
    }
}

fn close(a: f64, b: f64, relative: f64) {
    assert!((a - b).abs() <= relative * b.abs().max(1e-300), "{a:e} is not {b:e}");
}

/// Truth: Beer-Lambert in closed form over each control volume, by the test's own expm1; 1e-13 is the rounding of
/// 60 cells.
#[test]
fn each_control_volume_absorbs_the_exact_difference_of_flux() {
    let (d, alpha) = (3e-6, 1.1e6);
    let stack = layers(&[d], 60, &[vec![alpha]]);
    let operator = GenerationOperator::new(&stack, &faces(1, 0.0, 0.0));
    let entered = (1.0 - 0.04) * (1.0 - 0.07 - 0.02);
    close(operator.absorbed(0)[0], entered * -(-alpha * d).exp_m1(), 1e-14);
    let column = operator.apply(&[1.0]);
    let h = &stack[0].half_widths;
    let mut depth = 0.0;
    for (e, &value) in column.iter().enumerate() {
        let left = if e > 0 { h[e - 1] } else { 0.0 };
        let width = left + if e < h.len() { h[e] } else { 0.0 };
        close(value, entered * (-alpha * depth).exp() * -(-alpha * width).exp_m1(), 1e-13);
        depth += width;
    }
    close(depth, d, 1e-14);
}

/// Truth: photons are conserved. The test adds up the entries and the shares itself; 1e-14 per wavelength, from
/// transparent to opaque, with and without mirrors, from either side.
#[test]
fn photons_balance_at_every_wavelength() {
    let alphas: Vec<f64> = (0..60).map(|i| 10f64.powf(-2.0 + 0.18 * f64::from(i))).collect();
    let weak: Vec<f64> = alphas.iter().map(|a| a * 0.013).collect();
    for cells in [1, 7, 250] {
        let stack = layers(&[30e-9, 0.8e-6, 3e-6], cells, &[weak.clone(), alphas.clone(), weak.clone()]);
        for (far, internal) in [(0.0, 0.0), (0.9, 0.0), (0.97, 0.7), (1.0, 1.0)] {
            for from_rear in [false, true] {
                let faces = Faces { from_rear, ..faces(alphas.len(), far, internal) };
                let operator = GenerationOperator::new(&stack, &faces);
                for (w, column) in operator.matrix().outer_iterator().enumerate() {
                    let s = operator.shares()[w];
                    let entries: f64 = column.data().iter().sum();
                    let layers: f64 = operator.absorbed(w).iter().sum();
                    let rest = s.shaded + s.reflected + s.coating + s.transmitted + s.escaped;
                    assert!((entries + rest - 1.0).abs() < 1e-14, "{w} {far}: {:e}", entries + rest - 1.0);
                    assert!((layers + rest - 1.0).abs() < 1e-14);
                    assert!(column.data().iter().all(|&v| v > 0.0));
                }
            }
        }
    }
}

/// Truth: 50 passes summed one by one, the flux followed half cell by half cell; what is left after them is below
/// 0.8^25 0.6^50, so 1e-12 is rounding.
#[test]
fn the_closed_series_is_the_sum_of_fifty_passes() {
    let (far, internal) = (0.8, 0.9);
    let alphas = [vec![4e5], vec![1.5e5]];
    let stack = layers(&[0.5e-6, 2e-6], 9, &alphas);
    let operator = GenerationOperator::new(&stack, &faces(1, far, internal));
    // Half cells in order with the entry that owns each.
    let mut halves = Vec::new();
    let mut entry = 0;
    for (layer, alpha) in stack.iter().zip(&alphas) {
        for &h in &layer.half_widths {
            halves.push((entry, (-alpha[0] * h).exp()));
            halves.push((entry + 1, (-alpha[0] * h).exp()));
            entry += 1;
        }
        entry += 1;
    }
    let mut absorbed = vec![0.0; entry];
    let (mut escaped, mut transmitted) = (0.0, 0.0);
    let mut flux = (1.0 - 0.04) * (1.0 - 0.09);
    for pass in 0..50 {
        let backward = pass % 2 == 1;
        if backward {
            halves.reverse();
        }
        for &(e, t) in &halves {
            absorbed[e] += flux * (1.0 - t);
            flux *= t;
        }
        if backward {
            halves.reverse();
            escaped += flux * (1.0 - internal);
            flux *= internal;
        } else {
            transmitted += flux * (1.0 - far);
            flux *= far;
        }
    }
    for (value, expected) in operator.apply(&[1.0]).iter().zip(&absorbed) {
        close(*value, *expected, 1e-12);
    }
    close(operator.shares()[0].escaped, escaped, 1e-12);
    close(operator.shares()[0].transmitted, transmitted, 1e-12);
}

/// Truth: two passes through a slab in front of a perfect mirror, `1 - e^(-2 alpha d)`, rounding alone.
#[test]
fn a_rear_mirror_doubles_the_path() {
    let (d, alpha) = (1e-6, 3e5);
    let operator = GenerationOperator::new(&layers(&[d], 20, &[vec![alpha]]), &faces(1, 1.0, 0.0));
    let entered = 0.96 * 0.91;
    close(operator.absorbed(0)[0], entered * -(-2.0 * alpha * d).exp_m1(), 1e-14);
    close(operator.shares()[0].escaped, entered * (-2.0 * alpha * d).exp(), 1e-14);
    assert_eq!(operator.shares()[0].transmitted, 0.0);
}

/// Truth: between perfect mirrors whatever enters is absorbed, however weakly the layer absorbs; without any
/// absorption nothing can enter. Exact up to rounding.
#[test]
fn perfect_mirrors_trap_light_until_it_is_absorbed() {
    let stack = layers(&[1e-6], 20, &[vec![1e-3, 1e-12, 0.0]]);
    let operator = GenerationOperator::new(&stack, &faces(3, 1.0, 1.0));
    for w in 0..2 {
        close(operator.absorbed(w)[0], 0.96 * 0.91, 1e-13);
    }
    assert_eq!(operator.absorbed(2)[0], 0.0);
    close(operator.shares()[2].escaped, 0.96 * 0.91, 1e-15);
}

/// Truth: a reversed stack lit from the rear is the same device; to the bit, for the same numbers meet in the
/// same order.
#[test]
fn light_from_the_rear_is_the_mirror_image() {
    let (a, b) = (vec![2e7, 3e5], vec![9e5, 4e4]);
    let stack = layers(&[0.2e-6, 1e-6], 12, &[a, b]);
    let mut mirrored = stack.clone();
    mirrored.reverse();
    mirrored.iter_mut().for_each(|l| l.half_widths.reverse());
    let from_front = faces(2, 0.8, 0.5);
    let from_rear = Faces { from_rear: true, ..from_front.clone() };
    let one = GenerationOperator::new(&stack, &from_front);
    let two = GenerationOperator::new(&mirrored, &from_rear);
    for flux in [[1.0, 0.0], [0.0, 1.0]] {
        let mut image = two.apply(&flux);
        image.reverse();
        assert_eq!(one.apply(&flux), image);
    }
    assert_eq!(one.shares()[1].escaped, two.shares()[1].escaped);
}

/// Truth: y . (A x) = x . (A^T y), and cells of one coefficient are a uniform layer; rounding and to the bit.
#[test]
fn transposed_and_by_cell_agree() {
    let alpha = vec![2e6, 1e5, 0.0];
    let uniform = layers(&[1e-6, 2e-6], 15, &[alpha.clone(), alpha.clone()]);
    let mut by_cell = uniform.clone();
    for layer in &mut by_cell {
        layer.absorption = Absorption::Cells(alpha.iter().map(|&a| vec![a; 15]).collect());
    }
    let operator = GenerationOperator::new(&uniform, &faces(3, 0.6, 0.3));
    let other = GenerationOperator::new(&by_cell, &faces(3, 0.6, 0.3));
    assert_eq!(operator.matrix(), other.matrix());
    assert_eq!(operator.matrix().shape(), (32, 3));
    let x = [1.5, 0.25, 7.0];
    let y: Vec<f64> = (0..32).map(|e| (f64::from(e) * 0.7).sin()).collect();
    let left: f64 = operator.apply(&x).iter().zip(&y).map(|(a, b)| a * b).sum();
    let right: f64 = operator.apply_transposed(&y).iter().zip(&x).map(|(a, b)| a * b).sum();
    close(left, right, 1e-13);
    // The transparent wavelength stores nothing; inert layers neither.
    assert_eq!(operator.matrix().outer_iterator().map(|c| c.data().len()).collect::<Vec<_>>(), [32, 32, 0]);
}

/// Truth: central differences of the same operator; their own error is about 1e-9 relative.
#[test]
fn derivatives_flow_through_thickness_absorption_and_mirrors() {
    type D = Dual<f64, 4>;
    let base = [1.3e-6, 4e5, 0.7, 0.4];
    fn build<P: Scalar>(p: [P; 4]) -> GenerationOperator<P> {
        let cells = 8;
        let h = p[0] * (0.5 / f64::from(cells));
        let layer = OpticalLayer {
            half_widths: vec![h; cells as usize],
            absorption: Absorption::Uniform(vec![p[1]]),
        };
        let zero = P::constant(0.0);
        let faces = Faces {
            from_rear: false,
            shading: zero,
            entrance: vec![(zero, zero)],
            far_reflectance: p[2],
            internal_reflectance: p[3],
        };
        GenerationOperator::new(&[layer], &faces)
    }
    let dual = build::<D>(std::array::from_fn(|i| D::variable(base[i], i)));
    let value = build::<f64>(base);
    // Values beside derivatives have the bits of values alone.
    for (d, v) in dual.apply(&[1.0]).iter().zip(value.apply(&[1.0])) {
        assert_eq!(d.re, v);
    }
    for i in 0..4 {
        let step = base[i] * 1e-5;
        let mut at = [base; 2];
        at[0][i] -= step;
        at[1][i] += step;
        let [low, high] = at.map(build::<f64>);
        let of = |o: &GenerationOperator<f64>| [o.absorbed(0)[0], o.shares()[0].escaped, o.apply(&[1.0])[3]];
        let duals = [dual.absorbed(0)[0], dual.shares()[0].escaped, dual.apply(&[1.0])[3]];
        for ((l, h), d) in of(&low).iter().zip(of(&high)).zip(duals) {
            close(d.d[i], (h - l) / (2.0 * step), 1e-7);
        }
    }
}

/// Truth: arithmetic on light that fades. Beyond 1e-60 nothing is stored, and what is stored still balances.
#[test]
fn light_that_has_faded_is_not_stored() {
    let operator = GenerationOperator::new(&layers(&[1e-4], 100, &[vec![1e8]]), &faces(1, 0.5, 0.5));
    let stored = operator.matrix().nnz();
    assert!(stored > 1 && stored < 40, "{stored}");
    close(operator.absorbed(0)[0], 0.96 * 0.91, 1e-14);
    assert_eq!(operator.shares()[0].transmitted, 0.0);
}
