//! Fixed-point intervals, directions and arcs with outward rounding.
//!
//! A [`Interval`] holds a number in `[-1, 1]` as two 32-bit integers with 30 fraction bits; a
//! [`Product`] holds sums of products as two 64-bit integers with 60. There are no angles: an
//! [`Arc`] is the counter-clockwise sweep between two [`Direction`]s, compared by the signs of
//! exact cross products. Every operation returns a set that contains every true result, so a
//! bound may be wider than the truth but never narrower.
//!
//! Overflow: inputs are at most 2^30 in size, so a product is at most 2^60 and the sums formed
//! here (at most seven products, or eight with a squared offset, which the packer keeps 2^40 below
//! 2^60) stay below 2^63.

mod arc;
mod direction;
mod interval;

pub use arc::Arc;
pub use direction::Direction;
pub use interval::{Interval, Product};

/// The number one: 30 fraction bits.
pub const ONE: i32 = 1 << 30;
/// Fraction bits of an [`Interval`].
pub const FRACTION_BITS: u32 = 30;
/// One squared: 60 fraction bits.
pub const ONE_SQUARED: i64 = 1 << 60;

/// Proof that some quantity has no value left.
///
/// Only the intersections of this module make one, so whoever holds it has seen integer
/// arithmetic arrive at an empty set.
#[derive(Debug)]
pub struct Empty(());

/// Narrows a 64-bit number to the range of an interval.
#[inline]
fn clamp(value: i64) -> i32 {
    value.clamp(-(ONE as i64), ONE as i64) as i32
}

/// Square root rounded down; zero for negative numbers.
#[inline]
pub fn root_down(square: i64) -> i64 {
    (square.max(0) as u64).isqrt() as i64
}

/// Square root rounded up; zero for negative numbers.
#[inline]
pub fn root_up(square: i64) -> i64 {
    let square = square.max(0) as u64;
    let root = square.isqrt();
    (root + (root * root < square) as u64) as i64
}
