//! Damping of Newton updates in the logarithm of the densities.

use crate::math::elementary;

/// An update is taken whole up to this size and grows with its logarithm beyond (empirical: 1 to 2 serve alike).
const WHOLE: f64 = 1.0;

/// The damped form of an update: itself up to 1, `1 + ln|x|` with its sign beyond, continuous and smooth at 1.
///
/// Applied to the change of ln n, it lets a density rise by any factor that the linear equations predict: from dark to
/// light, minority densities rise by twenty decades, and Newton's method in the potentials alone diverges there.
#[inline(always)]
pub fn damped(update: f64) -> f64 {
    let size = update.abs();
    if size <= WHOLE { update } else { (WHOLE + elementary::ln(size / WHOLE)).copysign(update) }
}
