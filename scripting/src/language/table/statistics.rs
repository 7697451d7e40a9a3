//! Statistics of the numbers of a column.

use epiloom_solver::math::sum;

/// Arithmetic mean.
pub fn mean(values: &[f64]) -> f64 {
    sum(values.iter().copied()) / values.len() as f64
}

/// Sample standard deviation: the root of the squares about the mean over the count less one; nothing for one value.
pub fn spread(values: &[f64]) -> Option<f64> {
    if values.len() < 2 {
        return None;
    }
    let centre = mean(values);
    // the second sum takes out what rounding left in the mean
    let squares = sum(values.iter().map(|v| (v - centre) * (v - centre)));
    let rest = sum(values.iter().map(|v| v - centre));
    let count = values.len() as f64;
    Some(((squares - rest * rest / count) / (count - 1.0)).sqrt())
}

/// Values in rising order.
pub fn sorted(values: &[f64]) -> Vec<f64> {
    let mut sorted = values.to_vec();
    sorted.sort_by(f64::total_cmp);
    sorted
}

/// The quantile of sorted values for a share from 0 to 1: the straight line between the order statistics about
/// `(n - 1) share`.
///
/// Source: R. J. Hyndman and Y. Fan, The American Statistician 50, 361 (1996), definition 7.
pub fn quantile(sorted: &[f64], share: f64) -> f64 {
    let place = share * (sorted.len() - 1) as f64;
    let below = place.floor() as usize;
    let above = (below + 1).min(sorted.len() - 1);
    sorted[below] + (place - below as f64) * (sorted[above] - sorted[below])
}

/// Bounds between which a share lies with 95 % confidence, from `passed` of `count` independent trials.
///
/// Source: E. B. Wilson, J. Am. Stat. Assoc. 22, 209 (1927).
pub fn share_bounds(passed: usize, count: usize) -> (f64, f64) {
    /// The standard normal distribution's 97.5 % point.
    const Z: f64 = 1.959_963_984_540_054;
    let (n, share) = (count as f64, passed as f64 / count as f64);
    let centre = share + Z * Z / (2.0 * n);
    let half = Z * (share * (1.0 - share) / n + Z * Z / (4.0 * n * n)).sqrt();
    let whole = 1.0 + Z * Z / n;
    // at the ends the formula gives exactly these, which rounding would miss
    let low = if passed == 0 { 0.0 } else { (centre - half) / whole };
    let high = if passed == count { 1.0 } else { (centre + half) / whole };
    (low, high)
}
