//! Intervals and products of intervals.

use super::{Empty, FRACTION_BITS, ONE, clamp, root_down, root_up};

/// A closed interval of numbers in `[-1, 1]`, 30 fraction bits.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Interval {
    /// Lower bound.
    pub lo: i32,
    /// Upper bound.
    pub hi: i32,
}

/// A closed interval of sums of products, 60 fraction bits.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Product {
    /// Lower bound.
    pub lo: i64,
    /// Upper bound.
    pub hi: i64,
}

impl Interval {
    /// `[-1, 1]`, which every direction cosine and every scaled length satisfies.
    pub const UNIT: Interval = Interval { lo: -ONE, hi: ONE };
    /// The number zero.
    pub const ZERO: Interval = Interval { lo: 0, hi: 0 };

    /// The interval of one number.
    #[inline]
    pub const fn point(value: i32) -> Interval {
        Interval {
            lo: value,
            hi: value,
        }
    }

    /// From wider bounds; what lies outside `[-1, 1]` is cut off, because no true value does.
    #[inline]
    pub fn clamped(lo: i64, hi: i64) -> Interval {
        // A set wholly outside keeps its side and becomes empty on intersection.
        Interval {
            lo: lo.clamp(-(ONE as i64), ONE as i64 + 1) as i32,
            hi: hi.clamp(-(ONE as i64) - 1, ONE as i64) as i32,
        }
    }

    /// Upper minus lower bound.
    #[inline]
    pub fn width(self) -> i64 {
        self.hi as i64 - self.lo as i64
    }

    /// Largest absolute value.
    #[inline]
    pub fn magnitude(self) -> i64 {
        (-(self.lo as i64)).max(self.hi as i64)
    }

    /// As a product: 30 more fraction bits.
    #[inline]
    pub fn widen(self) -> Product {
        Product {
            lo: (self.lo as i64) << FRACTION_BITS,
            hi: (self.hi as i64) << FRACTION_BITS,
        }
    }

    /// Difference of two lengths, which again is at most one.
    #[inline]
    pub fn less(self, other: Interval) -> Interval {
        Interval::clamped(
            self.lo as i64 - other.hi as i64,
            self.hi as i64 - other.lo as i64,
        )
    }

    /// The mirror image about zero.
    #[inline]
    pub fn negate(self) -> Interval {
        Interval {
            lo: -self.hi,
            hi: -self.lo,
        }
    }

    /// Exact product.
    #[inline]
    pub fn times(self, other: Interval) -> Product {
        let (a, b) = (self.lo as i64, self.hi as i64);
        let (c, d) = (other.lo as i64, other.hi as i64);
        let (p, q, r, s) = (a * c, a * d, b * c, b * d);
        Product {
            lo: p.min(q).min(r.min(s)),
            hi: p.max(q).max(r.max(s)),
        }
    }

    /// Exact product with a number.
    #[inline]
    pub fn scale(self, factor: i32) -> Product {
        let (p, q) = (
            self.lo as i64 * factor as i64,
            self.hi as i64 * factor as i64,
        );
        Product {
            lo: p.min(q),
            hi: p.max(q),
        }
    }

    /// Exact square.
    #[inline]
    pub fn square(self) -> Product {
        let (a, b) = (
            self.lo as i64 * self.lo as i64,
            self.hi as i64 * self.hi as i64,
        );
        Product {
            lo: if self.lo <= 0 && self.hi >= 0 {
                0
            } else {
                a.min(b)
            },
            hi: a.max(b),
        }
    }

    /// Keeps the values both allow.
    ///
    /// Returns whether the interval lost more than a sixteenth of its width.
    ///
    /// # Errors
    /// [`Empty`] when nothing is left.
    #[inline]
    pub fn meet(&mut self, other: Interval) -> Result<bool, Empty> {
        let before = self.width();
        self.lo = self.lo.max(other.lo);
        self.hi = self.hi.min(other.hi);
        if self.lo > self.hi {
            return Err(Empty(()));
        }
        Ok((before - self.width()) * 16 > before)
    }

    /// Keeps the values whose square lies in `square`: also closes the gap around zero when one
    /// sign is already excluded.
    ///
    /// # Errors
    /// [`Empty`] when nothing is left.
    #[inline]
    pub fn meet_square(&mut self, square: Product) -> Result<bool, Empty> {
        let own = self.square();
        if own.lo >= square.lo && own.hi <= square.hi {
            return Ok(false);
        }
        if square.hi < 0 || square.lo > square.hi {
            return Err(Empty(()));
        }
        let (mut lo, mut hi) = (self.lo, self.hi);
        if own.hi > square.hi {
            let root = clamp(root_up(square.hi));
            lo = lo.max(-root);
            hi = hi.min(root);
        }
        if own.lo < square.lo {
            let root = root_down(square.lo).min(ONE as i64 + 1) as i32;
            if lo > -root {
                lo = lo.max(root);
            }
            if hi < root {
                hi = hi.min(-root);
            }
        }
        self.meet(Interval { lo, hi })
    }
}

impl Product {
    /// The number zero.
    pub const ZERO: Product = Product { lo: 0, hi: 0 };

    /// Sum. The caller adds at most eight products of intervals, one of them a
    /// squared offset (see [`Placement::square`](crate::machine::Placement::square)).
    #[inline]
    pub fn plus(self, other: Product) -> Product {
        Product {
            lo: self.lo + other.lo,
            hi: self.hi + other.hi,
        }
    }

    /// Difference.
    #[inline]
    pub fn minus(self, other: Product) -> Product {
        Product {
            lo: self.lo - other.hi,
            hi: self.hi - other.lo,
        }
    }

    /// Twice the value.
    #[inline]
    pub fn double(self) -> Product {
        Product {
            lo: 2 * self.lo,
            hi: 2 * self.hi,
        }
    }

    /// Half the value, rounded outward.
    #[inline]
    pub fn halve(self) -> Product {
        Product {
            lo: self.lo >> 1,
            hi: -((-self.hi) >> 1),
        }
    }

    /// Quotient by an interval, rounded outward; `None` unless that excludes zero by a margin.
    #[inline]
    pub fn over_interval(self, divisor: Interval) -> Option<Interval> {
        const LEAST: i32 = 1 << 10;
        let (low, high, lo, hi) = if divisor.lo >= LEAST {
            (divisor.lo, divisor.hi, self.lo, self.hi)
        } else if divisor.hi <= -LEAST {
            (-divisor.hi, -divisor.lo, -self.hi, -self.lo)
        } else {
            return None;
        };
        let (low, high) = (low as i64, high as i64);
        Some(Interval::clamped(
            lo.div_euclid(if lo >= 0 { high } else { low }),
            -(-hi).div_euclid(if hi >= 0 { low } else { high }),
        ))
    }

    /// Rounded outward to 30 fraction bits and widened by `slack` units.
    #[inline]
    pub fn round(self, slack: i32) -> Interval {
        Interval::clamped(
            (self.lo >> FRACTION_BITS) - slack as i64,
            -((-self.hi) >> FRACTION_BITS) + slack as i64,
        )
    }

    /// Keeps the values both allow; returns whether more than a sixteenth of the width went.
    ///
    /// # Errors
    /// [`Empty`] when nothing is left.
    #[inline]
    pub fn meet(&mut self, other: Product) -> Result<bool, Empty> {
        let before = self.hi - self.lo;
        self.lo = self.lo.max(other.lo);
        self.hi = self.hi.min(other.hi);
        if self.lo > self.hi {
            return Err(Empty(()));
        }
        Ok(before - (self.hi - self.lo) > before >> 4)
    }

    /// Quotient by a positive product, rounded outward to 30 fraction bits.
    ///
    /// Returns `None` when the divisor may be zero.
    #[inline]
    pub fn over(self, divisor: Product) -> Option<Interval> {
        if divisor.lo <= 0 {
            return None;
        }
        // Bring the divisor to at most 31 bits; what the shift drops is rounded outward.
        let shift = 33u32.saturating_sub(divisor.hi.leading_zeros());
        let (low, high) = (divisor.lo >> shift, (divisor.hi >> shift) + 1);
        if low == 0 {
            return None;
        }
        let limit = high + 1;
        let (above, below) = (
            (self.lo >> shift).clamp(-limit, limit),
            (-((-self.hi) >> shift)).clamp(-limit, limit),
        );
        let lo = (above << FRACTION_BITS).div_euclid(if above >= 0 { high } else { low });
        let hi = -((-below) << FRACTION_BITS).div_euclid(if below >= 0 { low } else { high });
        Some(Interval::clamped(lo, hi))
    }
}
