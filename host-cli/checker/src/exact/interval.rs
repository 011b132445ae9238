//! Closed intervals whose ends are whole numbers of grains; a grain is 10^-24 of the unit.
//!
//! Sums, differences and exact products round nothing. Where a result is no whole number of
//! grains, its ends are moved outward. An interval whose lower end is above its upper one is
//! empty. Bounds of a proof are multiples of 10^-12, so products of two of them are whole grains.

use core::cmp::{max, min};
use core::ops::{Add, Neg, Sub};

use dashu_int::ops::{Abs, DivRemEuclid, SquareRoot};
use dashu_int::{IBig, Sign, UBig};
use dashu_ratio::RBig;

use crate::proof::Span;

/// Grains in one.
pub static ONE: IBig = IBig::from_parts_const(Sign::Positive, 10u128.pow(24));
/// Grains in a number of a proof's grid.
static PER_PICO: IBig = IBig::from_parts_const(Sign::Positive, 10u128.pow(12));

/// `number` of a proof's grid in grains.
pub fn grains(number: i64) -> IBig {
    IBig::from(number) * &PER_PICO
}

/// Greatest whole number not above `numerator / denominator`, for a positive denominator.
pub fn floor(numerator: &IBig, denominator: &IBig) -> IBig {
    numerator.div_rem_euclid(denominator).0
}

/// Least whole number not below `numerator / denominator`, for a positive denominator.
pub fn ceil(numerator: &IBig, denominator: &IBig) -> IBig {
    -floor(&-numerator, denominator)
}

/// Greatest whole number whose square is not above `square`; zero below zero.
pub fn root_floor(square: &IBig) -> IBig {
    match UBig::try_from(square.clone()) {
        Ok(square) => IBig::from(square.sqrt()),
        Err(_) => IBig::ZERO,
    }
}

/// Least whole number that is not negative and whose square is not below `square`.
pub fn root_ceil(square: &IBig) -> IBig {
    let root = root_floor(square);
    if &(&root * &root) < square {
        root + IBig::ONE
    } else {
        root
    }
}

/// All numbers from `lo` to `hi`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Interval {
    /// Lower end.
    pub lo: IBig,
    /// Upper end.
    pub hi: IBig,
}

impl Interval {
    /// From `lo` to `hi`.
    pub fn new(lo: IBig, hi: IBig) -> Self {
        Self { lo, hi }
    }

    /// One number only.
    pub fn point(at: IBig) -> Self {
        Self {
            lo: at.clone(),
            hi: at,
        }
    }

    /// Zero.
    pub fn zero() -> Self {
        Self::point(IBig::ZERO)
    }

    /// One.
    pub fn one() -> Self {
        Self::point(ONE.clone())
    }

    /// No number.
    pub fn empty() -> Self {
        Self::new(IBig::ONE, IBig::ZERO)
    }

    /// From `-radius` to `radius`.
    pub fn around_zero(radius: IBig) -> Self {
        Self::new(-&radius, radius)
    }

    /// An interval of a proof.
    pub fn of_span(span: Span) -> Self {
        Self::new(grains(span.lo), grains(span.hi))
    }

    /// The fraction `number`, a point if it is a whole number of grains.
    pub fn of_fraction(number: &RBig) -> Self {
        let numerator = number.numerator() * &ONE;
        let denominator = IBig::from(number.denominator().clone());
        Self::new(
            floor(&numerator, &denominator),
            ceil(&numerator, &denominator),
        )
    }

    /// Square root of the fraction `square`, which must not be negative.
    pub fn root_of_fraction(square: &RBig) -> Self {
        let numerator = square.numerator() * &ONE * &ONE;
        let denominator = IBig::from(square.denominator().clone());
        Self::new(
            root_floor(&floor(&numerator, &denominator)),
            root_ceil(&ceil(&numerator, &denominator)),
        )
    }

    /// Whether there is no number in it.
    pub fn is_empty(&self) -> bool {
        self.lo > self.hi
    }

    /// Whether zero is in it.
    pub fn has_zero(&self) -> bool {
        self.lo <= IBig::ZERO && self.hi >= IBig::ZERO
    }

    /// What is in both.
    pub fn meet(&self, other: &Self) -> Self {
        Self {
            lo: max(&self.lo, &other.lo).clone(),
            hi: min(&self.hi, &other.hi).clone(),
        }
    }

    /// Least interval with both, either of which may be empty.
    pub fn hull(&self, other: &Self) -> Self {
        match (self.is_empty(), other.is_empty()) {
            (true, _) => other.clone(),
            (_, true) => self.clone(),
            _ => Self {
                lo: min(&self.lo, &other.lo).clone(),
                hi: max(&self.hi, &other.hi).clone(),
            },
        }
    }

    /// Largest size of a number in it.
    pub fn size(&self) -> IBig {
        max((&self.lo).abs(), (&self.hi).abs())
    }

    /// `hi - lo`.
    pub fn width(&self) -> IBig {
        &self.hi - &self.lo
    }

    /// Each number times `factor`, exactly; the unit is the product of both units.
    pub fn scale(&self, factor: &IBig) -> Self {
        let (a, b) = (&self.lo * factor, &self.hi * factor);
        if factor.sign() == Sign::Negative {
            Self::new(b, a)
        } else {
            Self::new(a, b)
        }
    }

    /// Products, exactly; the unit is the product of both units.
    pub fn product(&self, other: &Self) -> Self {
        if other.lo >= IBig::ZERO {
            return self.times_positive(other);
        }
        if other.hi <= IBig::ZERO {
            return -self.times_positive(&-other);
        }
        if self.lo >= IBig::ZERO {
            return other.times_positive(self);
        }
        if self.hi <= IBig::ZERO {
            return -other.times_positive(&-self);
        }
        Self::new(
            min(&self.lo * &other.hi, &self.hi * &other.lo),
            max(&self.lo * &other.lo, &self.hi * &other.hi),
        )
    }

    /// Products with an interval that has no negative number.
    fn times_positive(&self, other: &Self) -> Self {
        let far = |negative| if negative { &other.hi } else { &other.lo };
        Self::new(
            &self.lo * far(self.lo.sign() == Sign::Negative),
            &self.hi * far(self.hi.sign() == Sign::Positive),
        )
    }

    /// Squares, exactly; the unit is the square of the unit.
    pub fn square(&self) -> Self {
        let (a, b) = (&self.lo * &self.lo, &self.hi * &self.hi);
        if self.has_zero() {
            Self::new(IBig::ZERO, max(a, b))
        } else if self.lo > IBig::ZERO {
            Self::new(a, b)
        } else {
            Self::new(b, a)
        }
    }

    /// Square roots of numbers in squared grains; those below zero have none.
    pub fn root(&self) -> Self {
        Self::new(root_floor(&self.lo), root_ceil(&self.hi))
    }

    /// Each number divided by the positive `divisor`, ends moved outward.
    pub fn shrink(&self, divisor: &IBig) -> Self {
        Self::new(floor(&self.lo, divisor), ceil(&self.hi, divisor))
    }

    /// Products in grains, ends moved outward.
    pub fn times(&self, other: &Self) -> Self {
        self.product(other).shrink(&ONE)
    }

    /// Quotients, ends moved outward; `None` if `divisor` has zero. The unit is the quotient of
    /// both units.
    pub fn over(&self, divisor: &Self) -> Option<Self> {
        if divisor.has_zero() {
            return None;
        }
        if divisor.hi < IBig::ZERO {
            return (-self).over(&-divisor);
        }
        let near = |positive| {
            if positive { &divisor.hi } else { &divisor.lo }
        };
        Some(Self::new(
            floor(&self.lo, near(self.lo >= IBig::ZERO)),
            ceil(&self.hi, near(self.hi <= IBig::ZERO)),
        ))
    }
}

impl Neg for &Interval {
    type Output = Interval;

    fn neg(self) -> Interval {
        Interval::new(-&self.hi, -&self.lo)
    }
}

impl Neg for Interval {
    type Output = Interval;

    fn neg(self) -> Interval {
        -&self
    }
}

impl Add for &Interval {
    type Output = Interval;

    fn add(self, other: Self) -> Interval {
        Interval::new(&self.lo + &other.lo, &self.hi + &other.hi)
    }
}

impl Sub for &Interval {
    type Output = Interval;

    fn sub(self, other: Self) -> Interval {
        Interval::new(&self.lo - &other.hi, &self.hi - &other.lo)
    }
}
