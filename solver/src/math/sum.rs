//! Sums in a fixed order, compensated, that know how much they have added.

use super::number::Num;

/// A running sum whose rounding errors are gathered beside it (Knuth's exact error of an addition, without
/// comparisons, so that it serves the derivatives of a dual number as well), with the sum of absolute terms.
///
/// Accuracy: one rounding of the result plus `count^2 epsilon^2` of the sum of absolute terms. The order of the
/// terms is the order of the calls. The sum of absolute terms is a plain sum: it serves as a scale.
/// Source: D. E. Knuth, The Art of Computer Programming, vol. 2, section 4.2.2, from memory.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct CompensatedSum<T> {
    total: T,
    carry: T,
    magnitude: T,
}

impl<T: Num> CompensatedSum<T> {
    /// The empty sum.
    pub fn new() -> Self {
        let zero = T::constant(0.0);
        Self { total: zero, carry: zero, magnitude: zero }
    }
    /// Adds a term.
    #[inline(always)]
    pub fn add(&mut self, term: T) {
        let total = self.total + term;
        let part_of_term = total - self.total;
        let part_of_total = total - part_of_term;
        self.carry = self.carry + ((self.total - part_of_total) + (term - part_of_term));
        self.total = total;
        self.magnitude = self.magnitude + term.abs();
    }
    /// The sum of the terms.
    pub fn value(&self) -> T {
        self.total + self.carry
    }
    /// The sum of the absolute values of the terms: the scale against which a cancellation is judged.
    pub fn magnitude(&self) -> T {
        self.magnitude
    }
}

impl<T: Num> Default for CompensatedSum<T> {
    fn default() -> Self {
        Self::new()
    }
}

impl<T: Num> Extend<T> for CompensatedSum<T> {
    fn extend<I: IntoIterator<Item = T>>(&mut self, terms: I) {
        for term in terms {
            self.add(term);
        }
    }
}

impl<T: Num> FromIterator<T> for CompensatedSum<T> {
    fn from_iter<I: IntoIterator<Item = T>>(terms: I) -> Self {
        let mut sum = Self::new();
        sum.extend(terms);
        sum
    }
}

/// The compensated sum of terms, in their order.
pub fn sum<T: Num>(terms: impl IntoIterator<Item = T>) -> T {
    terms.into_iter().collect::<CompensatedSum<T>>().value()
}

#[cfg(test)]
mod tests {
    use super::super::dual::Dual;
    use super::*;

    /// Exact solution: terms whose sum is known though a plain sum loses it wholly; also in the derivative.
    #[test]
    fn cancelled_digits_are_kept() {
        let terms = [1e16, 1.0, -3.0, 1e-3, -1e16, 5.0];
        let gathered: CompensatedSum<f64> = terms.into_iter().collect();
        assert_eq!(gathered.value(), 3.001);
        assert!((gathered.magnitude() / 2e16 - 1.0).abs() < 1e-15);
        assert_ne!(terms.iter().sum::<f64>(), 3.001);
        let duals = terms.map(|t| Dual { re: 1.0, d: [t] });
        let total: Dual<f64, 1> = sum(duals);
        assert_eq!((total.re, total.d[0]), (6.0, 3.001));
        assert_eq!(CompensatedSum::<f64>::default().value(), 0.0);
    }
}
