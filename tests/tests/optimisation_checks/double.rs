//! Numbers of twice double precision, for a program that double precision is too coarse for.

use std::cmp::Ordering;
use std::ops::{Add, Div, Mul, Neg, Sub};

use balk_core::simplex::Real;

/// An unevaluated sum of two doubles, the second at most half a unit in the last place of the first
/// (Dekker, *A floating-point technique for extending the available precision*, Numer. Math. 18, 1971,
/// 224-242).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Double(f64, f64);

impl Double {
    /// The nearest integer.
    pub fn to_i64(self) -> i64 {
        let whole = self.0.round();
        whole as i64 + ((self.0 - whole) + self.1).round() as i64
    }
}

/// `a + b` and its rounding error.
fn sum(a: f64, b: f64) -> Double {
    let sum = a + b;
    let part = sum - a;
    Double(sum, (a - (sum - part)) + (b - part))
}

/// `a + b` and its rounding error, for `a` not smaller in size than `b`.
fn sorted_sum(a: f64, b: f64) -> Double {
    let sum = a + b;
    // An infinite sum has no error.
    Double(sum, if sum.is_finite() { b - (sum - a) } else { 0.0 })
}

impl Add for Double {
    type Output = Self;
    fn add(self, other: Self) -> Self {
        let high = sum(self.0, other.0);
        sorted_sum(
            high.0,
            if high.0.is_finite() {
                high.1 + self.1 + other.1
            } else {
                0.0
            },
        )
    }
}

impl Sub for Double {
    type Output = Self;
    fn sub(self, other: Self) -> Self {
        self + -other
    }
}

impl Neg for Double {
    type Output = Self;
    fn neg(self) -> Self {
        Self(-self.0, -self.1)
    }
}

impl Mul for Double {
    type Output = Self;
    fn mul(self, other: Self) -> Self {
        let product = self.0 * other.0;
        let error = self.0.mul_add(other.0, -product) + (self.0 * other.1 + self.1 * other.0);
        sorted_sum(product, if product.is_finite() { error } else { 0.0 })
    }
}

impl Div for Double {
    type Output = Self;
    fn div(self, other: Self) -> Self {
        let quotient = Self(self.0 / other.0, 0.0);
        let rest = self - quotient * other;
        quotient + Self(rest.0 / other.0, 0.0)
    }
}

impl PartialOrd for Double {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        match self.0.partial_cmp(&other.0) {
            Some(Ordering::Equal) => self.1.partial_cmp(&other.1),
            order => order,
        }
    }
}

impl Real for Double {
    const ZERO: Self = Self(0.0, 0.0);
    const ONE: Self = Self(1.0, 0.0);
    const INFINITY: Self = Self(f64::INFINITY, 0.0);
    const TOLERANCE: Self = Self(1e-24, 0.0);
    const NEGLIGIBLE: Self = Self(1e-20, 0.0);

    fn from_i64(value: i64) -> Self {
        let high = value as f64;
        Self(high, (i128::from(value) - high as i128) as f64)
    }

    fn to_i32(self) -> i32 {
        self.to_i64() as i32
    }

    fn magnitude(self) -> Self {
        if self < Self::ZERO { -self } else { self }
    }

    fn power_of_two(self) -> Self {
        Self(self.0.power_of_two(), 0.0)
    }
}
