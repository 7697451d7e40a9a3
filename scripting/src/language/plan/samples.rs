//! Samples of the unit cube: coordinate `d` of point `k` is a function of the seed, `d` and `k` alone, never of other points.
//!
//! Random numbers come from Philox4x32-10, a generator that turns a counter into numbers: J. K. Salmon, M. A. Moraes,
//! R. O. Dror, D. E. Shaw, "Parallel random numbers: as easy as 1, 2, 3", SC'11 (2011).

/// How points fill the cube.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Filling {
    /// Independent of each other.
    Random,
    /// Each coordinate once in each of as many equal slices as there are points.
    LatinHypercube,
    /// A Sobol sequence, randomised.
    LowDiscrepancy,
}

/// Most coordinates of a low-discrepancy sample: the length of the table of direction numbers.
pub const MOST_COORDINATES: usize = 21;

/// Purposes of random numbers, so that none is used twice.
#[derive(Clone, Copy)]
enum Purpose {
    Value = 1,
    Place = 2,
    Order = 3,
    Scramble = 4,
}

/// Ten rounds of Philox over a counter of four words under a key of two.
pub fn philox(counter: [u32; 4], key: [u32; 2]) -> [u32; 4] {
    let [mut a, mut b, mut c, mut d] = counter;
    let [mut k, mut l] = key;
    for _ in 0..10 {
        let first = u64::from(a) * 0xD251_1F53;
        let second = u64::from(c) * 0xCD9E_8D57;
        (a, b, c, d) =
            ((second >> 32) as u32 ^ b ^ k, second as u32, (first >> 32) as u32 ^ d ^ l, first as u32);
        k = k.wrapping_add(0x9E37_79B9);
        l = l.wrapping_add(0xBB67_AE85);
    }
    [a, b, c, d]
}

/// 64 random bits for a purpose, a coordinate and an index.
fn bits(seed: u64, purpose: Purpose, stream: u64, index: u64) -> u64 {
    let half = |word: u64| [word as u32, (word >> 32) as u32];
    let [a, b] = half(index);
    let [c, d] = half(stream);
    // purposes differ in bits that a seed written by a person does not reach
    let key = half(seed ^ ((purpose as u64) << 56));
    let [x, y, ..] = philox([a, b, c, d], key);
    u64::from(x) | u64::from(y) << 32
}

/// A number inside (0, 1), never 0 nor 1, from the upper 53 bits.
fn inside_unit(bits: u64) -> f64 {
    ((bits >> 11) as f64 + 0.5) * (1.0 / 9_007_199_254_740_992.0)
}

/// The stream of a coordinate: its name, so that another coordinate beside it changes nothing (FNV-1a, 64 bits).
pub fn stream(name: &str) -> u64 {
    name.bytes()
        .fold(0xcbf2_9ce4_8422_2325, |hash, byte| (hash ^ u64::from(byte)).wrapping_mul(0x0100_0000_01b3))
}

/// Coordinate of a point in (0, 1): `dimension` counts from 0, `stream` is that of its name, `count` the points of all.
pub fn unit_value(filling: Filling, seed: u64, dimension: usize, stream: u64, index: u64, count: u64) -> f64 {
    match filling {
        Filling::Random => inside_unit(bits(seed, Purpose::Value, stream, index)),
        Filling::LatinHypercube => {
            let slice = shuffled(seed, stream, index, count);
            let place = inside_unit(bits(seed, Purpose::Place, stream, index));
            ((slice as f64 + place) / count as f64).clamp(f64::EPSILON / 4.0, 1.0 - f64::EPSILON / 2.0)
        }
        Filling::LowDiscrepancy => inside_unit(scrambled(seed, stream, sobol(dimension, index))),
    }
}

/// Where index `k` stands in a shuffle of `0..count`: a Feistel network over the next power of four, walked until it
/// falls inside, so that the order needs no table and no two indices meet.
pub fn shuffled(seed: u64, stream: u64, k: u64, count: u64) -> u64 {
    let mut half_bits = 1;
    while half_bits < 32 && (1_u64 << (2 * half_bits)) < count {
        half_bits += 1;
    }
    let mask = (1_u64 << half_bits) - 1;
    let mut place = k;
    loop {
        let (mut left, mut right) = (place >> half_bits, place & mask);
        for round in 0..6 {
            let mixed = bits(seed, Purpose::Order, stream, right | round << 40) & mask;
            (left, right) = (right, left ^ mixed);
        }
        place = left << half_bits | right;
        if place < count {
            return place;
        }
    }
}

/// Coordinate `dimension` of point `index` of the Sobol sequence, as 64 bits after the point.
///
/// Sources: I. M. Sobol, USSR Comput. Math. Math. Phys. 7, 86 (1967); direction numbers: S. Joe and F. Y. Kuo,
/// SIAM J. Sci. Comput. 30, 2635 (2008), from memory and compared with an independent program.
pub fn sobol(dimension: usize, index: u64) -> u64 {
    let mut directions = [0_u64; 64];
    let bits_used = (64 - index.leading_zeros()) as usize;
    match dimension.checked_sub(1).and_then(|d| DIRECTIONS.get(d)) {
        None => {
            for (i, direction) in directions.iter_mut().enumerate().take(bits_used) {
                *direction = 1 << (63 - i);
            }
        }
        Some((degree, polynomial, initial)) => {
            for i in 0..bits_used {
                directions[i] = if i < *degree {
                    u64::from(initial[i]) << (63 - i)
                } else {
                    let mut v = directions[i - degree] ^ (directions[i - degree] >> degree);
                    for j in 1..*degree {
                        if polynomial >> (degree - 1 - j) & 1 == 1 {
                            v ^= directions[i - j];
                        }
                    }
                    v
                };
            }
        }
    }
    (0..bits_used).filter(|i| index >> i & 1 == 1).fold(0, |sum, i| sum ^ directions[i])
}

/// Owen's nested scrambling: each bit is flipped or not by a random number that depends on the bits before it.
///
/// Source: A. B. Owen, in Monte Carlo and Quasi-Monte Carlo Methods in Scientific Computing, Springer (1995), p. 299.
fn scrambled(seed: u64, stream: u64, x: u64) -> u64 {
    let key = bits(seed, Purpose::Scramble, stream, 0);
    let mut result = 0;
    for place in 0..53 {
        let before = if place == 0 { 0 } else { x >> (64 - place) };
        let flip = mixed(key ^ mixed(before | 1 << place)) & 1;
        result |= ((x >> (63 - place) & 1) ^ flip) << (63 - place);
    }
    result
}

/// A bijection of 64 bits in which every bit depends on every other (the finaliser of SplitMix64: G. L. Steele,
/// D. Lea, C. H. Flood, OOPSLA 2014, p. 453).
fn mixed(bits: u64) -> u64 {
    let x = bits.wrapping_add(0x9E37_79B9_7F4A_7C15);
    let x = (x ^ (x >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
    let x = (x ^ (x >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
    x ^ (x >> 31)
}

/// Degree, inner coefficients of the primitive polynomial, initial odd numbers, for dimensions from the second on.
const DIRECTIONS: [(usize, u32, &[u32]); MOST_COORDINATES - 1] = [
    (1, 0, &[1]),
    (2, 1, &[1, 3]),
    (3, 1, &[1, 3, 1]),
    (3, 2, &[1, 1, 1]),
    (4, 1, &[1, 1, 3, 3]),
    (4, 4, &[1, 3, 5, 13]),
    (5, 2, &[1, 1, 5, 5, 17]),
    (5, 4, &[1, 1, 5, 5, 5]),
    (5, 7, &[1, 1, 7, 11, 19]),
    (5, 11, &[1, 1, 5, 1, 1]),
    (5, 13, &[1, 1, 1, 3, 11]),
    (5, 14, &[1, 3, 5, 5, 31]),
    (6, 1, &[1, 3, 3, 9, 7, 49]),
    (6, 13, &[1, 1, 1, 15, 21, 21]),
    (6, 16, &[1, 3, 1, 13, 27, 49]),
    (6, 19, &[1, 1, 1, 15, 7, 5]),
    (6, 22, &[1, 3, 1, 15, 13, 25]),
    (6, 25, &[1, 1, 5, 5, 19, 61]),
    (7, 1, &[1, 3, 7, 11, 23, 15, 103]),
    (7, 4, &[1, 3, 7, 13, 13, 15, 69]),
];
