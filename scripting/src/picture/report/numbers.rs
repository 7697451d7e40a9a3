//! The numbers of the page: every column of an archive to the bit, packed small.
//!
//! A column of n numbers is taken as n 64-bit integers (the bits of the doubles) and replaced by its differences, none, one,
//! two or three times, whichever packs best; each difference, a two's complement integer, is folded (0, -1, 1, -2 become
//! 0, 1, 2, 3). Of the n results first all lowest bytes are written, then all second ones, and so on. All columns of a
//! block follow each other, and the block is packed by deflate (RFC 1950). `numbers.js` unpacks it.

use std::collections::BTreeMap;

use base64::Engine as _;
use base64::engine::general_purpose::STANDARD;
use miniz_oxide::deflate::compress_to_vec_zlib;
use serde::Serialize;

/// How hard blocks are packed: 1 to 10.
const LEVEL: u8 = 9;

/// How hard the trials are packed that choose the number of differences.
const TRIAL_LEVEL: u8 = 1;

/// Most differences that are tried.
const MOST_DIFFERENCES: usize = 3;

/// Where a column stands in its block.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
pub struct Packed(pub usize, pub usize);

/// The columns of one block, each held once however often it is used.
#[derive(Debug, Default)]
pub struct Pool {
    columns: Vec<Packed>,
    places: BTreeMap<[u8; 32], usize>,
    planes: Vec<u8>,
}

impl Pool {
    /// Takes a column; its number in the block.
    pub fn add(&mut self, values: &[f64]) -> usize {
        let bytes: Vec<u8> = values.iter().flat_map(|value| value.to_le_bytes()).collect();
        let key = *blake3::hash(&bytes).as_bytes();
        if let Some(place) = self.places.get(&key) {
            return *place;
        }
        let place = self.columns.len();
        self.places.insert(key, place);
        let mut bits: Vec<u64> = values.iter().map(|value| value.to_bits()).collect();
        let mut best = (0, planes(&bits));
        let mut least = trial(&best.1);
        for times in 1..=MOST_DIFFERENCES.min(values.len().saturating_sub(1)) {
            for index in (1..bits.len()).rev() {
                bits[index] = bits[index].wrapping_sub(bits[index - 1]);
            }
            let folded: Vec<u64> =
                bits.iter().map(|d| (d << 1) ^ (d.cast_signed() >> 63).cast_unsigned()).collect();
            let written = planes(&folded);
            let length = trial(&written);
            if length < least {
                least = length;
                best = (times, written);
            }
        }
        self.columns.push(Packed(values.len(), best.0));
        self.planes.extend(best.1);
        place
    }

    /// Length and number of differences of each column, and the packed block.
    pub fn finish(self) -> (Vec<Packed>, String) {
        (self.columns, pack(&self.planes))
    }
}

/// Packed by deflate, as base64.
pub fn pack(bytes: &[u8]) -> String {
    STANDARD.encode(compress_to_vec_zlib(bytes, LEVEL))
}

fn trial(bytes: &[u8]) -> usize {
    compress_to_vec_zlib(bytes, TRIAL_LEVEL).len()
}

/// All lowest bytes, then all second ones, and so on.
fn planes(bits: &[u64]) -> Vec<u8> {
    (0..8).flat_map(|byte| bits.iter().map(move |value| value.to_le_bytes()[byte])).collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use miniz_oxide::inflate::decompress_to_vec_zlib;

    /// The page's own way back, in Rust.
    fn unpacked(columns: &[Packed], block: &str) -> Vec<Vec<f64>> {
        let bytes = decompress_to_vec_zlib(&STANDARD.decode(block).expect("base64")).expect("deflate");
        let mut rest = bytes.as_slice();
        let take = |Packed(n, times): &Packed| {
            let (mine, others) = rest.split_at(8 * n);
            rest = others;
            let mut bits: Vec<u64> = (0..*n)
                .map(|i| (0..8).fold(0, |sum, byte| sum | u64::from(mine[byte * n + i]) << (8 * byte)))
                .collect();
            if *times > 0 {
                bits = bits.iter().map(|d| (d >> 1) ^ (d & 1).wrapping_neg()).collect();
            }
            for _ in 0..*times {
                for index in 1..*n {
                    bits[index] = bits[index].wrapping_add(bits[index - 1]);
                }
            }
            bits.into_iter().map(f64::from_bits).collect()
        };
        columns.iter().map(take).collect()
    }

    /// Source of truth: the bits that went in; no tolerance. Smooth columns must take less room than they had.
    #[test]
    fn every_number_comes_back_to_the_bit() {
        let smooth: Vec<f64> = (0..500).map(|i| 1.0 / (1.0 + f64::from(i))).collect();
        let odd = vec![f64::NAN, -0.0, 0.0, f64::INFINITY, f64::NEG_INFINITY, 5e-324, -1e300, 1e300];
        let mut pool = Pool::default();
        let given = [&smooth, &odd, &vec![], &vec![3.5], &smooth];
        let places: Vec<usize> = given.iter().map(|values| pool.add(values)).collect();
        assert_eq!(places, [0, 1, 2, 3, 0], "a column is held once");
        let (columns, block) = pool.finish();
        assert!(block.len() < 8 * smooth.len(), "{}", block.len());
        let back = unpacked(&columns, &block);
        for (values, place) in given.iter().zip(places) {
            let bits = |list: &[f64]| list.iter().map(|v| v.to_bits()).collect::<Vec<_>>();
            assert_eq!(bits(&back[place]), bits(values));
        }
    }
}
