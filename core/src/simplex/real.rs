//! The arithmetic the simplex runs in.

use core::ops::{Add, Div, Mul, Neg, Sub};

/// A floating-point type: `f32` on the controller, `f64` on the workstation, or a wider one of the caller's.
pub trait Real:
    Copy
    + PartialOrd
    + Add<Output = Self>
    + Div<Output = Self>
    + Mul<Output = Self>
    + Neg<Output = Self>
    + Sub<Output = Self>
{
    /// 0.
    const ZERO: Self;
    /// 1.
    const ONE: Self;
    /// Stands for an absent side inside the tableau.
    const INFINITY: Self;
    /// Violations up to this, times one plus the size of the violated side, count as met. Rows and unknowns
    /// are scaled to size 1 and a basic value is a sum of tens of rounded products, so this is at least 16
    /// units in the last place. Smaller, and rounding noise is pivoted on; larger, and systems that are
    /// empty by less are called feasible. Decides only when to stop, never what is proved.
    const TOLERANCE: Self;
    /// Tableau entries up to this size are rounding noise and never pivoted on, since dividing by one
    /// would amplify the noise of the whole row by its inverse.
    const NEGLIGIBLE: Self;

    /// The nearest value.
    fn from_i64(value: i64) -> Self;
    /// The nearest integer, ties away from zero; the nearest end when out of range; 0 for a NaN.
    fn to_i32(self) -> i32;
    /// Absolute value.
    fn magnitude(self) -> Self;
    /// The greatest power of two not above a normal positive value.
    fn power_of_two(self) -> Self;

    /// The larger of two values; `self` if either is a NaN.
    fn larger(self, other: Self) -> Self {
        if other > self { other } else { self }
    }

    /// The smaller of two values; `self` if either is a NaN.
    fn smaller(self, other: Self) -> Self {
        if other < self { other } else { self }
    }
}

macro_rules! real {
    ($float:ty, $exponent_mask:literal, $tolerance:literal, $negligible:literal) => {
        impl Real for $float {
            const ZERO: Self = 0.0;
            const ONE: Self = 1.0;
            const INFINITY: Self = <$float>::INFINITY;
            const TOLERANCE: Self = $tolerance;
            const NEGLIGIBLE: Self = $negligible;

            fn from_i64(value: i64) -> Self {
                value as $float
            }

            fn to_i32(self) -> i32 {
                (self + (0.5 as $float).copysign(self)) as i32
            }

            fn magnitude(self) -> Self {
                self.abs()
            }

            fn power_of_two(self) -> Self {
                <$float>::from_bits(self.to_bits() & $exponent_mask)
            }
        }
    };
}

real!(f32, 0x7f80_0000, 1e-6, 1e-5);
real!(f64, 0x7ff0_0000_0000_0000, 1e-11, 1e-12);
