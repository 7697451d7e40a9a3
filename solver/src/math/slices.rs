//! Elementary functions over whole slices, in the widest vectors that the machine has.
//!
//! The same operations in the same order as the plain functions, so the same bits at every width: no operation is fused.

use super::elementary;

macro_rules! over_slices {
    ($(#[$doc:meta])* $name:ident, $plain:ident, $body:ident, $wide:ident) => {
        #[inline(always)]
        fn $body(values: &mut [f64]) {
            for x in values {
                *x = elementary::$plain(*x);
            }
        }

        #[cfg(target_arch = "x86_64")]
        #[target_feature(enable = "avx2")]
        fn $wide(values: &mut [f64]) {
            $body(values);
        }

        $(#[$doc])*
        pub fn $name(values: &mut [f64]) {
            #[cfg(target_arch = "x86_64")]
            if std::arch::is_x86_feature_detected!("avx2") {
                // The feature was just found on this machine, which is all that the call needs to be sound.
                #[allow(unsafe_code)]
                unsafe {
                    $wide(values);
                }
                return;
            }
            $body(values);
        }
    };
}

over_slices!(
    /// Replaces each value by its exponential.
    exp, exp, exp_body, exp_wide
);
over_slices!(
    /// Replaces each value by its exponential less one.
    exp_m1, exp_m1, exp_m1_body, exp_m1_wide
);

#[cfg(test)]
mod tests {
    /// Truth: the plain functions, to the bit, on this machine's widest vectors and on the plain path.
    #[test]
    fn slices_have_the_bits_of_single_values() {
        let values: Vec<f64> = (0..1003).map(|k| -720.0 + 1.43 * f64::from(k)).collect();
        let bits = |v: &[f64]| v.iter().map(|x| x.to_bits()).collect::<Vec<_>>();
        for (wide, body, plain) in [
            (
                super::exp as fn(&mut [f64]),
                super::exp_body as fn(&mut [f64]),
                super::elementary::exp as fn(f64) -> f64,
            ),
            (super::exp_m1, super::exp_m1_body, super::elementary::exp_m1),
        ] {
            let expected: Vec<f64> = values.iter().map(|x| plain(*x)).collect();
            for over in [wide, body] {
                let mut got = values.clone();
                over(&mut got);
                assert_eq!(bits(&got), bits(&expected));
            }
        }
    }
}
