//! Several numbers at once in vector registers: the assembly's kernels run on these, with the bits of the plain functions.
//!
//! [`Lanes`] is what a kernel is written over: `f64`, one number, runs everywhere; [`Two`] and [`Four`] are vectors, and
//! [`Double`] a pair of either. Every operation on vectors is the same operation on each of their numbers, and no operation
//! is fused, so a kernel gives the same bits at every width. Explicit vectors, because what a compiler makes of plain loops over such long formulas
//! changes with every change to them.

use std::ops::{Add, Mul, Neg, Sub};

use super::dual::Dual;
use super::elementary;
use super::number::{Num, Over};
use super::piecewise::Piecewise;

/// A [`Num`] that holds the values of neighbouring places of slices.
pub trait Lanes: Over<Self> + Over<f64> + elementary::Binary {
    /// How many.
    const WIDTH: usize;
    /// The numbers at `at`, `at + 1`, ... of a slice.
    fn load(from: &[f64], at: usize) -> Self;
    /// Writes the numbers to `at`, `at + 1`, ... of a slice.
    fn store(self, to: &mut [f64], at: usize);
}

/// How many numbers a kernel takes at a time: the levels of the dispatch.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Width {
    /// One: plain code for any machine.
    One,
    /// Four, in two SSE2 registers: any x86-64 machine.
    Four,
    /// Eight, in two AVX2 registers.
    Eight,
}

impl Width {
    /// All widths, narrowest first.
    pub const ALL: [Width; 3] = [Width::One, Width::Four, Width::Eight];

    /// Whether this machine has vectors for this width.
    pub fn available(self) -> bool {
        match self {
            Width::One => true,
            Width::Four => cfg!(target_arch = "x86_64"),
            #[cfg(target_arch = "x86_64")]
            Width::Eight => std::arch::is_x86_feature_detected!("avx2"),
            #[cfg(not(target_arch = "x86_64"))]
            Width::Eight => false,
        }
    }
    /// The widest that this machine has.
    pub fn widest() -> Width {
        Width::ALL.into_iter().rev().find(|width| width.available()).unwrap_or(Width::One)
    }
}

impl Lanes for f64 {
    const WIDTH: usize = 1;
    #[inline(always)]
    fn load(from: &[f64], at: usize) -> f64 {
        from[at]
    }
    #[inline(always)]
    fn store(self, to: &mut [f64], at: usize) {
        to[at] = self;
    }
}

/// Twice as many numbers, in two halves: the chains of dependent operations of two places of a slice side by side, which
/// fills the time that each alone would wait.
#[derive(Clone, Copy, Debug)]
pub struct Double<L>(L, L);

impl<L: Lanes> Lanes for Double<L> {
    const WIDTH: usize = 2 * L::WIDTH;
    #[inline(always)]
    fn load(from: &[f64], at: usize) -> Self {
        Double(L::load(from, at), L::load(from, at + L::WIDTH))
    }
    #[inline(always)]
    fn store(self, to: &mut [f64], at: usize) {
        self.0.store(to, at);
        self.1.store(to, at + L::WIDTH);
    }
}

macro_rules! by_halves {
    ($trait:ident, $name:ident) => {
        impl<L: Lanes> $trait for Double<L> {
            type Output = Self;
            #[inline(always)]
            fn $name(self, other: Self) -> Self {
                Double($trait::$name(self.0, other.0), $trait::$name(self.1, other.1))
            }
        }
        impl<L: Lanes> $trait<f64> for Double<L> {
            type Output = Self;
            #[inline(always)]
            fn $name(self, other: f64) -> Self {
                Double($trait::$name(self.0, other), $trait::$name(self.1, other))
            }
        }
    };
}
by_halves!(Add, add);
by_halves!(Sub, sub);
by_halves!(Mul, mul);

impl<L: Lanes> Neg for Double<L> {
    type Output = Self;
    #[inline(always)]
    fn neg(self) -> Self {
        Double(-self.0, -self.1)
    }
}

impl<L: Lanes> Num for Double<L> {
    type Mask = (L::Mask, L::Mask);
    #[inline(always)]
    fn constant(value: f64) -> Self {
        Double(L::constant(value), L::constant(value))
    }
    #[inline(always)]
    fn less(self, other: Self) -> Self::Mask {
        (self.0.less(other.0), self.1.less(other.1))
    }
    #[inline(always)]
    fn any(mask: Self::Mask) -> bool {
        L::any(mask.0) || L::any(mask.1)
    }
    #[inline(always)]
    fn select(mask: Self::Mask, yes: Self, no: Self) -> Self {
        Double(L::select(mask.0, yes.0, no.0), L::select(mask.1, yes.1, no.1))
    }
    #[inline(always)]
    fn recip(self) -> Self {
        Double(self.0.recip(), self.1.recip())
    }
    #[inline(always)]
    fn exp(self) -> Self {
        elementary::exp_of(self)
    }
    #[inline(always)]
    fn exp_m1(self) -> Self {
        elementary::exp_m1_of(self)
    }
    fn ln(self) -> Self {
        Double(self.0.ln(), self.1.ln())
    }
    #[inline(always)]
    fn sqrt(self) -> Self {
        Double(self.0.sqrt(), self.1.sqrt())
    }
    fn powf(self, exponent: f64) -> Self {
        Double(self.0.powf(exponent), self.1.powf(exponent))
    }
    fn sin(self) -> Self {
        Double(self.0.sin(), self.1.sin())
    }
    fn cos(self) -> Self {
        Double(self.0.cos(), self.1.cos())
    }
    fn erfc(self) -> Self {
        Double(self.0.erfc(), self.1.erfc())
    }
    #[inline(always)]
    fn piecewise(self, table: &Piecewise, order: usize) -> Self {
        table.evaluate(self, order)
    }
    #[inline(always)]
    fn piecewise_pair(self, table: &Piecewise, order: usize) -> (Self, Self) {
        table.evaluate_pair(self, order)
    }
}

impl<L: Lanes> elementary::Binary for Double<L> {
    #[inline(always)]
    fn half_power(rounded: Self) -> Self {
        Double(L::half_power(rounded.0), L::half_power(rounded.1))
    }
    #[inline(always)]
    fn rows(rounded: Self, table: &[[f64; Piecewise::TERMS]]) -> [Self; Piecewise::TERMS] {
        let (first, second) = (L::rows(rounded.0, table), L::rows(rounded.1, table));
        let mut rows = [Double(first[0], second[0]); Piecewise::TERMS];
        for (row, halves) in rows.iter_mut().zip(first.into_iter().zip(second)) {
            *row = Double(halves.0, halves.1);
        }
        rows
    }
}

/// A vector as the parameter of states of vectors, with or without derivatives.
macro_rules! parameter {
    ([$($generics:tt)*] $lanes:ty) => {
        impl<$($generics)*> Over<f64> for $lanes {
            #[inline(always)]
            fn lift(parameter: f64) -> Self {
                Self::constant(parameter)
            }
        }
        impl<$($generics)*> Over<$lanes> for $lanes {
            #[inline(always)]
            fn lift(parameter: Self) -> Self {
                parameter
            }
        }
        impl<const N: usize, $($generics)*> Add<$lanes> for Dual<$lanes, N> {
            type Output = Self;
            #[inline(always)]
            fn add(self, other: $lanes) -> Self {
                Self { re: self.re + other, d: self.d }
            }
        }
        impl<const N: usize, $($generics)*> Sub<$lanes> for Dual<$lanes, N> {
            type Output = Self;
            #[inline(always)]
            fn sub(self, other: $lanes) -> Self {
                Self { re: self.re - other, d: self.d }
            }
        }
        impl<const N: usize, $($generics)*> Mul<$lanes> for Dual<$lanes, N> {
            type Output = Self;
            #[inline(always)]
            fn mul(self, other: $lanes) -> Self {
                self.chain(self.re * other, other)
            }
        }
        impl<const N: usize, $($generics)*> Over<$lanes> for Dual<$lanes, N> {
            #[inline(always)]
            fn lift(parameter: $lanes) -> Self {
                Self::fixed(parameter)
            }
        }
    };
}
parameter!([L: Lanes] Double<L>);
#[cfg(target_arch = "x86_64")]
parameter!([] Two);
#[cfg(target_arch = "x86_64")]
parameter!([] Four);

/// Two numbers, one of each of two chains of operations.
#[cfg(target_arch = "x86_64")]
pub type Pair = Two;
/// Two numbers, one of each of two chains of operations.
#[cfg(not(target_arch = "x86_64"))]
pub type Pair = Double<f64>;

impl Double<f64> {
    /// Two numbers.
    #[inline(always)]
    pub fn pair(first: f64, second: f64) -> Self {
        Double(first, second)
    }
    /// The two numbers.
    #[inline(always)]
    pub fn split(self) -> [f64; 2] {
        [self.0, self.1]
    }
}

#[cfg(target_arch = "x86_64")]
pub use vectors::{Four, Two};

#[cfg(target_arch = "x86_64")]
#[allow(unsafe_code, reason = "vector instructions; `Four` exists only where the machine has them")]
mod vectors {
    use std::arch::x86_64::*;
    use std::mem::transmute;

    use super::*;

    /// A vector register as [`Lanes`]: what all of them have in common.
    macro_rules! vector {
        ($(#[$doc:meta])* $name:ident, $mask:ident, $register:ty, $width:literal, $splat:ident, $load:ident, $store:ident,
            $xor:ident, $divide:ident, $root:ident, [$($trait:ident $method:ident $instruction:ident),*]) => {
            $(#[$doc])*
            #[derive(Clone, Copy)]
            pub struct $name($register);

            /// The outcome of a comparison: all bits of a lane set or none.
            #[derive(Clone, Copy)]
            pub struct $mask($register);

            impl $name {
                #[inline(always)]
                fn array(self) -> [f64; $width] {
                    // Sound: as many doubles either way.
                    unsafe { transmute(self.0) }
                }
                /// A function of one number on each lane; for functions that are no hot loop's.
                #[inline(never)]
                fn each(self, f: impl Fn(f64) -> f64) -> Self {
                    Self::load(&self.array().map(f), 0)
                }
            }

            impl std::fmt::Debug for $name {
                fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
                    self.array().fmt(f)
                }
            }
            impl std::fmt::Debug for $mask {
                fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
                    $name(self.0).array().map(|lane| lane.to_bits() != 0).fmt(f)
                }
            }

            impl Lanes for $name {
                const WIDTH: usize = $width;
                #[inline(always)]
                fn load(from: &[f64], at: usize) -> Self {
                    let from = &from[at..at + $width];
                    // Sound: the slice has that many.
                    unsafe { $name($load(from.as_ptr())) }
                }
                #[inline(always)]
                fn store(self, to: &mut [f64], at: usize) {
                    let to = &mut to[at..at + $width];
                    // Sound: the slice has that many.
                    unsafe { $store(to.as_mut_ptr(), self.0) }
                }
            }

            $(
                impl $trait for $name {
                    type Output = Self;
                    #[inline(always)]
                    fn $method(self, other: Self) -> Self {
                        unsafe { $name($instruction(self.0, other.0)) }
                    }
                }
                impl $trait<f64> for $name {
                    type Output = Self;
                    #[inline(always)]
                    fn $method(self, other: f64) -> Self {
                        $trait::$method(self, Self::constant(other))
                    }
                }
            )*

            impl Neg for $name {
                type Output = Self;
                #[inline(always)]
                fn neg(self) -> Self {
                    unsafe { $name($xor(self.0, $splat(-0.0))) }
                }
            }

            impl Num for $name {
                type Mask = $mask;
                #[inline(always)]
                fn constant(value: f64) -> Self {
                    unsafe { $name($splat(value)) }
                }
                #[inline(always)]
                fn less(self, other: Self) -> $mask {
                    less(self, other)
                }
                #[inline(always)]
                fn any(mask: $mask) -> bool {
                    any(mask)
                }
                #[inline(always)]
                fn select(mask: $mask, yes: Self, no: Self) -> Self {
                    select(mask, yes, no)
                }
                #[inline(always)]
                fn recip(self) -> Self {
                    unsafe { $name($divide($splat(1.0), self.0)) }
                }
                #[inline(always)]
                fn exp(self) -> Self {
                    elementary::exp_of(self)
                }
                #[inline(always)]
                fn exp_m1(self) -> Self {
                    elementary::exp_m1_of(self)
                }
                fn ln(self) -> Self {
                    self.each(elementary::ln)
                }
                #[inline(always)]
                fn sqrt(self) -> Self {
                    unsafe { $name($root(self.0)) }
                }
                fn powf(self, exponent: f64) -> Self {
                    self.each(|x| elementary::pow(x, exponent))
                }
                fn sin(self) -> Self {
                    self.each(elementary::sin)
                }
                fn cos(self) -> Self {
                    self.each(elementary::cos)
                }
                fn erfc(self) -> Self {
                    self.each(elementary::erfc)
                }
                #[inline(always)]
                fn piecewise(self, table: &Piecewise, order: usize) -> Self {
                    table.evaluate(self, order)
                }
                #[inline(always)]
                fn piecewise_pair(self, table: &Piecewise, order: usize) -> (Self, Self) {
                    table.evaluate_pair(self, order)
                }
            }
        };
    }

    /// The row's number in the low bits of a rounded number.
    #[inline(always)]
    fn row(rounded: f64) -> usize {
        rounded.to_bits() as u32 as usize
    }

    mod two {
        use super::*;

        vector!(
            /// Two numbers in an SSE2 register, which every x86-64 machine has.
            Two, TwoMask, __m128d, 2, _mm_set1_pd, _mm_loadu_pd, _mm_storeu_pd, _mm_xor_pd, _mm_div_pd, _mm_sqrt_pd,
            [Add add _mm_add_pd, Sub sub _mm_sub_pd, Mul mul _mm_mul_pd]
        );

        #[inline(always)]
        fn less(a: Two, b: Two) -> TwoMask {
            unsafe { TwoMask(_mm_cmplt_pd(a.0, b.0)) }
        }
        #[inline(always)]
        fn any(mask: TwoMask) -> bool {
            unsafe { _mm_movemask_pd(mask.0) != 0 }
        }
        #[inline(always)]
        fn select(mask: TwoMask, yes: Two, no: Two) -> Two {
            unsafe { Two(_mm_or_pd(_mm_and_pd(mask.0, yes.0), _mm_andnot_pd(mask.0, no.0))) }
        }

        impl Two {
            /// Two numbers.
            #[inline(always)]
            pub fn pair(first: f64, second: f64) -> Self {
                unsafe { Two(_mm_set_pd(second, first)) }
            }
            /// The two numbers.
            #[inline(always)]
            pub fn split(self) -> [f64; 2] {
                self.array()
            }
        }

        impl elementary::Binary for Two {
            #[inline(always)]
            fn half_power(rounded: Self) -> Self {
                unsafe {
                    let bits = _mm_slli_epi64::<52>(_mm_castpd_si128(rounded.0));
                    Two(_mm_castsi128_pd(_mm_add_epi64(bits, _mm_set1_epi64x(1022 << 52))))
                }
            }
            #[inline(always)]
            fn rows(rounded: Self, table: &[[f64; Piecewise::TERMS]]) -> [Self; Piecewise::TERMS] {
                let last = table.len() - 1;
                let [a, b] = rounded.array();
                let (a, b) = (&table[row(a).min(last)], &table[row(b).min(last)]);
                let mut columns = [Two::constant(0.0); Piecewise::TERMS];
                for (k, column) in columns.iter_mut().enumerate() {
                    *column = unsafe { Two(_mm_set_pd(b[k], a[k])) };
                }
                columns
            }
        }
    }

    mod four {
        use super::*;

        vector!(
            /// Four numbers in an AVX2 register.
            ///
            /// Its functions use AVX2 instructions: only code below a check of [`Width::available`] may make one. They are
            /// inlined into such code, which must be compiled for AVX2 for them to be fast.
            Four, FourMask, __m256d, 4, _mm256_set1_pd, _mm256_loadu_pd, _mm256_storeu_pd, _mm256_xor_pd, _mm256_div_pd,
            _mm256_sqrt_pd, [Add add _mm256_add_pd, Sub sub _mm256_sub_pd, Mul mul _mm256_mul_pd]
        );

        #[inline(always)]
        fn less(a: Four, b: Four) -> FourMask {
            unsafe { FourMask(_mm256_cmp_pd::<_CMP_LT_OQ>(a.0, b.0)) }
        }
        #[inline(always)]
        fn any(mask: FourMask) -> bool {
            unsafe { _mm256_movemask_pd(mask.0) != 0 }
        }
        #[inline(always)]
        fn select(mask: FourMask, yes: Four, no: Four) -> Four {
            unsafe { Four(_mm256_blendv_pd(no.0, yes.0, mask.0)) }
        }

        /// Four columns of four rows, from column `at` on.
        #[inline(always)]
        fn transposed(rows: [&[f64]; 4], at: usize) -> [Four; 4] {
            let [a, b, c, d] = rows;
            let (a, b) = (Four::load(a, at).0, Four::load(b, at).0);
            let (c, d) = (Four::load(c, at).0, Four::load(d, at).0);
            unsafe {
                let (ab_even, ab_odd) = (_mm256_unpacklo_pd(a, b), _mm256_unpackhi_pd(a, b));
                let (cd_even, cd_odd) = (_mm256_unpacklo_pd(c, d), _mm256_unpackhi_pd(c, d));
                [
                    Four(_mm256_permute2f128_pd::<0x20>(ab_even, cd_even)),
                    Four(_mm256_permute2f128_pd::<0x20>(ab_odd, cd_odd)),
                    Four(_mm256_permute2f128_pd::<0x31>(ab_even, cd_even)),
                    Four(_mm256_permute2f128_pd::<0x31>(ab_odd, cd_odd)),
                ]
            }
        }

        impl elementary::Binary for Four {
            #[inline(always)]
            fn half_power(rounded: Self) -> Self {
                unsafe {
                    let bits = _mm256_slli_epi64::<52>(_mm256_castpd_si256(rounded.0));
                    Four(_mm256_castsi256_pd(_mm256_add_epi64(bits, _mm256_set1_epi64x(1022 << 52))))
                }
            }
            #[inline(always)]
            fn rows(rounded: Self, table: &[[f64; Piecewise::TERMS]]) -> [Self; Piecewise::TERMS] {
                let last = table.len() - 1;
                let [a, b, c, d] = rounded.array();
                let (a, b) = (&table[row(a).min(last)], &table[row(b).min(last)]);
                let (c, d) = (&table[row(c).min(last)], &table[row(d).min(last)]);
                // Four rows of eight coefficients, transposed in two halves; the ninth by itself.
                let [c0, c1, c2, c3] = transposed([a, b, c, d], 0);
                let [c4, c5, c6, c7] = transposed([a, b, c, d], 4);
                let c8 = unsafe { Four(_mm256_set_pd(d[8], c[8], b[8], a[8])) };
                [c0, c1, c2, c3, c4, c5, c6, c7, c8]
            }
        }
    }

    pub use four::Four;
    pub use two::Two;
}

#[cfg(test)]
mod tests;
