//! Machine files, read exactly.

mod chain;
mod digest;
mod fields;
mod read;

pub use chain::{Chain, Drive, Limit, Link, Moving, Pose, Variable};
pub use digest::digest;
pub use fields::ReadError;
pub use read::{Kind, Machine};

use dashu_int::{IBig, ops::DivRem};
use dashu_ratio::RBig;

use crate::exact::function;
use crate::exact::interval::Interval;

/// An angle or a length, exactly: a decimal, and a decimal of degrees.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Amount {
    /// Radians or metres.
    pub plain: RBig,
    /// Degrees.
    pub degrees: RBig,
}

impl Amount {
    /// None.
    pub fn zero() -> Self {
        Self::plain(RBig::ZERO)
    }

    /// Radians or metres.
    pub fn plain(number: RBig) -> Self {
        Self {
            plain: number,
            degrees: RBig::ZERO,
        }
    }

    /// Degrees.
    pub fn degrees(number: RBig) -> Self {
        Self {
            plain: RBig::ZERO,
            degrees: number,
        }
    }

    /// `self * ratio + other`.
    pub fn times_plus(&self, ratio: &RBig, other: &Self) -> Self {
        Self {
            plain: &self.plain * ratio + &other.plain,
            degrees: &self.degrees * ratio + &other.degrees,
        }
    }

    /// In radians or metres.
    pub fn enclosure(&self) -> Interval {
        let plain = Interval::of_fraction(&self.plain);
        if self.degrees == RBig::ZERO {
            return plain;
        }
        let degrees = &self.degrees / RBig::from(180);
        let angle = function::pi()
            .scale(degrees.numerator())
            .shrink(&IBig::from(degrees.denominator().clone()));
        &plain + &angle
    }

    /// Sine and cosine, points for whole quarter turns given in degrees.
    pub fn sine_cosine(&self) -> (Interval, Interval) {
        let quarters = &self.degrees / RBig::from(90);
        if self.plain == RBig::ZERO && quarters.is_int() {
            let (zero, one) = (Interval::zero(), Interval::one());
            let (_, rest) = quarters.numerator().div_rem(IBig::from(4));
            return match i8::try_from(rest).unwrap_or(0).rem_euclid(4) {
                0 => (zero, one),
                1 => (one, zero),
                2 => (zero, -one),
                _ => (-one, zero),
            };
        }
        let angle = self.enclosure();
        (function::sine(&angle), function::cosine(&angle))
    }
}
