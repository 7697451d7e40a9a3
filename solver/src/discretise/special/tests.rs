//! Tests of how distributions of defects are cut into levels.

use super::*;

/// Truth: moments of the distributions: weight 1; mean 0 and variance 1 of a Gaussian (cut at 4 standard deviations, 1e-3); mean 1
/// of a tail (cut at 12, 1e-4); a tail that the gap cuts short at 1 has the mean (1 - 2/e)/(1 - 1/e).
#[test]
fn distributions_have_their_moments() {
    let moment = |points: &[(f64, f64)], k: i32| points.iter().map(|(x, w)| w * x.powi(k)).sum::<f64>();
    for kt in [0.3, 1.0, 5.0] {
        let gaussian = gaussian(1.0, kt);
        assert!((moment(&gaussian, 0) - 1.0).abs() < 1e-14 && moment(&gaussian, 1).abs() < 1e-14);
        assert!((moment(&gaussian, 2) - 1.0).abs() < 1.5e-3, "{}", moment(&gaussian, 2));
        let whole = tail(1.0, kt, 40.0);
        assert!((moment(&whole, 1) - 1.0).abs() < 1e-4, "{}", moment(&whole, 1));
        let short = tail(1.0, kt, 1.0);
        let e = 1f64.exp();
        assert!((moment(&short, 1) - (1.0 - 2.0 / e) / (1.0 - 1.0 / e)).abs() < 1e-8);
    }
}

/// Truth: the occupancy of a distribution by a Fermi level, summed over 40,001 equal steps here, for widths
/// above and below kT; 3e-5 of all states where the level lies at the end of what is counted (6e-5 lie beyond).
#[test]
fn occupancy_of_a_distribution() {
    let kt = 0.02585;
    let fermi = |e: f64| 1.0 / (1.0 + (e / kt).exp());
    for width in [0.01, 0.05, 0.15] {
        for level in [-0.2, -0.03, 0.0, 0.05, 0.3] {
            let found: f64 = gaussian(width, kt).iter().map(|(x, w)| w * fermi(x * width - level)).sum();
            let fine = (-20_000..=20_000).map(|k| 4.0 * f64::from(k) / 20_000.0);
            let (sum, all) = fine.fold((0.0, 0.0), |(sum, all), x| {
                let w = (-0.5 * x * x).exp();
                (sum + w * fermi(x * width - level), all + w)
            });
            assert!((found - sum / all).abs() < 3e-5, "{width} {level}: {found} {}", sum / all);
            let found: f64 = tail(width, kt, 3.0).iter().map(|(x, w)| w * fermi(x * width - level)).sum();
            let fine = (0..40_000).map(|k| 12.0 * (f64::from(k) + 0.5) / 40_000.0);
            let (sum, all) = fine.fold((0.0, 0.0), |(sum, all), x| {
                let w = (-x).exp();
                (sum + w * fermi(x * width - level), all + w)
            });
            assert!((found - sum / all).abs() < 1e-5, "tail {width} {level}: {found} {}", sum / all);
        }
    }
}
