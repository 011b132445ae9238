//! Fixed-point intervals, directions and arcs with outward rounding.
//!
//! A [`Interval`] holds a number in `[-1, 1]` as two 32-bit integers with 30 fraction bits; a
//! [`Product`] holds sums of products as two 64-bit integers with 60. There are no angles: an
//! [`Arc`] is the counter-clockwise sweep between two [`Direction`]s, compared by the signs of
//! exact cross products. Every operation returns a set that contains every true result, so a
//! bound may be wider than the truth but never narrower.
//!
//! Overflow: inputs are at most 2^30 in size, so a product is at most 2^60 and the sums formed
//! here (at most seven products) stay below 2^63.

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

/// Narrows a 64-bit number to the range of an interval.
#[inline]
fn clamp(value: i64) -> i32 {
    value.clamp(-(ONE as i64), ONE as i64) as i32
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

    /// Sum. The caller adds at most seven products of intervals.
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

/// A direction in the plane: the ray through `(x, y)`, not both zero.
///
/// The length does not matter for comparing; [`Direction::normalised`] brings it to one within
/// a few units, which [`Arc::cosine`] relies on.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Direction {
    /// First component.
    pub x: i32,
    /// Second component.
    pub y: i32,
}

/// How far a normalised direction's components may lie from the true cosine and sine, in units.
const DIRECTION_SLACK: i64 = 6;

impl Direction {
    /// Along the first axis.
    pub const EAST: Direction = Direction { x: ONE, y: 0 };
    /// Along the second axis.
    pub const NORTH: Direction = Direction { x: 0, y: ONE };
    /// Against the first axis.
    pub const WEST: Direction = Direction { x: -ONE, y: 0 };
    /// Against the second axis.
    pub const SOUTH: Direction = Direction { x: 0, y: -ONE };

    /// Mirror image about the first axis: the angle negated.
    #[inline]
    pub fn conjugate(self) -> Direction {
        Direction {
            x: self.x,
            y: -self.y,
        }
    }

    /// A quarter turn counter-clockwise.
    #[inline]
    pub fn quarter(self) -> Direction {
        Direction {
            x: -self.y,
            y: self.x,
        }
    }

    /// Exact product of lengths and sine of the angle from `self` to `other`.
    #[inline]
    pub fn cross(self, other: Direction) -> i64 {
        self.x as i64 * other.y as i64 - self.y as i64 * other.x as i64
    }

    /// Exact product of lengths and cosine of the angle between the two.
    #[inline]
    pub fn dot(self, other: Direction) -> i64 {
        self.x as i64 * other.x as i64 + self.y as i64 * other.y as i64
    }

    /// The sum of the two angles, as an unnormalised exact pair.
    #[inline]
    fn product(self, other: Direction) -> (i64, i64) {
        (
            self.x as i64 * other.x as i64 - self.y as i64 * other.y as i64,
            self.x as i64 * other.y as i64 + self.y as i64 * other.x as i64,
        )
    }

    /// The sum of the two angles; the ray may move by 2^-28.5 radians.
    #[inline]
    pub fn turned(self, by: Direction) -> Direction {
        Direction::shorten(self.product(by))
    }

    /// Shortens an exact pair to 30 bits. The ray moves by at most 2^-28.5 radians.
    #[inline]
    fn shorten((x, y): (i64, i64)) -> Direction {
        let size = x.unsigned_abs() | y.unsigned_abs();
        let zeros = size.leading_zeros();
        if zeros >= 34 {
            Direction {
                x: (x << (zeros - 34)) as i32,
                y: (y << (zeros - 34)) as i32,
            }
        } else {
            Direction {
                x: (x >> (34 - zeros)) as i32,
                y: (y >> (34 - zeros)) as i32,
            }
        }
    }

    /// Length one within the slack; the ray moves by at most 2^-29.5 radians.
    #[inline]
    pub fn normalised(self) -> Direction {
        let d = Direction::shorten((self.x as i64, self.y as i64));
        let length = ((d.dot(d)) as u64).isqrt() as i64;
        if length == 0 {
            return Direction::EAST;
        }
        Direction {
            x: clamp(((d.x as i64) << FRACTION_BITS) / length),
            y: clamp(((d.y as i64) << FRACTION_BITS) / length),
        }
    }

    /// Turned by 2^-27 radians, more than everything rounding may have moved it.
    #[inline]
    fn tilted(self, counter_clockwise: bool) -> Direction {
        let (dx, dy) = (self.x >> 27, self.y >> 27);
        if counter_clockwise {
            Direction {
                x: clamp((self.x - dy) as i64),
                y: clamp((self.y + dx) as i64),
            }
        } else {
            Direction {
                x: clamp((self.x + dy) as i64),
                y: clamp((self.y - dx) as i64),
            }
        }
    }

    /// As the width of an arc: within 2^-23 radians of a full turn.
    #[inline]
    fn nearly_full(self) -> bool {
        self.x > 0 && self.y < 0 && self.y > -128
    }

    /// Whether the counter-clockwise angle from `self` to `a` is at most the one to `b`.
    #[inline]
    pub fn ordered(self, a: Direction, b: Direction) -> bool {
        let (half_a, half_b) = (self.half(a), self.half(b));
        if half_a != half_b {
            return half_a < half_b;
        }
        a.cross(b) >= 0
    }

    /// Where `other` lies on the counter-clockwise way round from `self`: 0 same ray, 1 before
    /// half a turn, 2 opposite, 3 after.
    #[inline]
    fn half(self, other: Direction) -> u8 {
        let cross = self.cross(other);
        if cross > 0 {
            1
        } else if cross < 0 {
            3
        } else if self.dot(other) > 0 {
            0
        } else {
            2
        }
    }
}

/// A set of angles: counter-clockwise from `lo` to `hi`, or every angle.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Arc {
    /// First direction.
    pub lo: Direction,
    /// Last direction.
    pub hi: Direction,
    /// Every angle; then `lo` and `hi` are where the circle is cut open.
    pub full: bool,
}

impl Arc {
    /// Every angle.
    pub const FULL: Arc = Arc {
        lo: Direction::WEST,
        hi: Direction::WEST,
        full: true,
    };

    /// From one direction counter-clockwise to another.
    pub const fn new(lo: Direction, hi: Direction) -> Arc {
        Arc {
            lo,
            hi,
            full: false,
        }
    }

    /// Ends brought to length one and moved outward by more than that rounds.
    pub fn normalised(self) -> Arc {
        Arc {
            lo: self.lo.normalised().tilted(false),
            hi: self.hi.normalised().tilted(true),
            full: self.full,
        }
    }

    /// Whether the arc holds the direction.
    #[inline]
    pub fn contains(self, d: Direction) -> bool {
        self.full || self.lo.ordered(d, self.hi)
    }

    /// Whether the arc is wider than half a turn.
    #[inline]
    pub fn is_wide(self) -> bool {
        self.full || self.lo.cross(self.hi) < 0
    }

    /// Angles negated.
    #[inline]
    pub fn negate(self) -> Arc {
        Arc {
            lo: self.hi.conjugate(),
            hi: self.lo.conjugate(),
            full: self.full,
        }
    }

    /// The width of an arc that is not full, as a direction; it may be off by 2^-28.5 radians.
    #[inline]
    fn turn(self) -> Direction {
        Direction::shorten(self.hi.product(self.lo.conjugate()))
    }

    /// Whether moving the ends outward could make them pass each other.
    #[inline]
    pub fn is_nearly_full(self) -> bool {
        self.full || self.turn().nearly_full()
    }

    /// Every sum of an angle of each.
    pub fn plus(self, other: Arc) -> Arc {
        if self.is_nearly_full() || other.is_nearly_full() {
            return Arc::FULL;
        }
        // The widths together must leave 2^-24 radians before a full turn: rounding and moving the
        // ends outward takes less than 2^-25.
        const ROOM: Direction = Direction { x: ONE, y: 64 };
        let (own, others) = (self.turn(), other.turn());
        if Direction::EAST.half(own) != 0
            && !Direction::EAST.ordered(others.turned(ROOM), own.conjugate())
        {
            return Arc::FULL;
        }
        Arc::new(
            Direction::shorten(self.lo.product(other.lo)),
            Direction::shorten(self.hi.product(other.hi)),
        )
        .normalised()
    }

    /// Keeps the angles both allow. When those are two pieces the arc stays as it is.
    ///
    /// Returns whether an end moved by more than rounding.
    ///
    /// # Errors
    /// [`Empty`] when nothing is left.
    pub fn meet(&mut self, other: Arc) -> Result<bool, Empty> {
        if other.full {
            return Ok(false);
        }
        if self.full {
            *self = other;
            return Ok(true);
        }
        let first = self.contains(other.lo);
        let last = self.contains(other.hi);
        match (first, last) {
            (true, true) => {
                if self.lo.ordered(other.lo, other.hi) {
                    *self = other;
                    return Ok(true);
                }
                Ok(false)
            }
            (true, false) => {
                self.lo = other.lo;
                Ok(true)
            }
            (false, true) => {
                self.hi = other.hi;
                Ok(true)
            }
            (false, false) => {
                if other.contains(self.lo) {
                    Ok(false)
                } else {
                    Err(Empty(()))
                }
            }
        }
    }

    /// Bounds of the cosine. Ends are normalised.
    #[inline]
    pub fn cosine(self) -> Interval {
        self.component(Direction::EAST, Direction::WEST, |d| d.x)
    }

    /// Bounds of the sine. Ends are normalised.
    #[inline]
    pub fn sine(self) -> Interval {
        self.component(Direction::NORTH, Direction::SOUTH, |d| d.y)
    }

    #[inline]
    fn component(self, most: Direction, least: Direction, of: fn(Direction) -> i32) -> Interval {
        let (a, b) = (of(self.lo) as i64, of(self.hi) as i64);
        let mut bounds =
            Interval::clamped(a.min(b) - DIRECTION_SLACK, a.max(b) + DIRECTION_SLACK);
        if self.contains(most) {
            bounds.hi = ONE;
        }
        if self.contains(least) {
            bounds.lo = -ONE;
        }
        bounds
    }

    /// A direction near the middle: where the arc is cut in two.
    pub fn middle(self) -> Direction {
        if self.full {
            let d = self.lo;
            return Direction { x: -d.x, y: -d.y };
        }
        let sum = (
            self.lo.x as i64 + self.hi.x as i64,
            self.lo.y as i64 + self.hi.y as i64,
        );
        let across = self.lo.cross(self.hi);
        // Near half a turn the sum has no direction; a quarter turn from the start has.
        if sum.0.abs().max(sum.1.abs()) < (ONE >> 4) as i64 && (across != 0 || self.lo.dot(self.hi) < 0)
        {
            return self.lo.quarter().normalised();
        }
        let mut middle = Direction::shorten(sum).normalised();
        if across < 0 {
            middle = Direction {
                x: -middle.x,
                y: -middle.y,
            };
        }
        middle
    }

    /// The two halves either side of [`Arc::middle`]; together they are the arc.
    pub fn halves(self) -> (Arc, Arc) {
        let middle = self.middle();
        (
            Arc::new(self.lo, middle),
            Arc::new(middle, self.hi),
        )
    }

    /// The directions of a box of vectors: `None` when the box touches the origin.
    ///
    /// The ends are exact corners, not normalised; the arc is narrower than half a turn.
    #[inline]
    pub fn of_box(x: Interval, y: Interval) -> Option<(Direction, Direction)> {
        let corner = |x, y| Direction { x, y };
        if x.lo > 0 {
            Some((
                corner(if y.lo >= 0 { x.hi } else { x.lo }, y.lo),
                corner(if y.hi >= 0 { x.lo } else { x.hi }, y.hi),
            ))
        } else if x.hi < 0 {
            Some((
                corner(if y.hi >= 0 { x.hi } else { x.lo }, y.hi),
                corner(if y.lo >= 0 { x.lo } else { x.hi }, y.lo),
            ))
        } else if y.lo > 0 {
            // x straddles zero: from the right corner to the left one.
            Some((corner(x.hi, y.lo), corner(x.lo, y.lo)))
        } else if y.hi < 0 {
            Some((corner(x.lo, y.hi), corner(x.hi, y.hi)))
        } else {
            None
        }
    }

    /// The angles by which a vector of the second box must turn to become one of the first.
    ///
    /// `None` when a box touches the origin or both are wider than a quarter turn.
    #[inline]
    pub fn between(
        to: (Direction, Direction),
        from: (Direction, Direction),
        current: Arc,
    ) -> Option<Arc> {
        if to.0.dot(to.1) <= 0 && from.0.dot(from.1) <= 0 {
            return None;
        }
        let lo = Direction::shorten(to.0.product(from.1.conjugate()));
        let hi = Direction::shorten(to.1.product(from.0.conjugate()));
        // Nothing to gain when the current arc lies inside.
        if !current.full {
            let wider = Arc::new(lo, hi);
            if wider.contains(current.lo)
                && wider.contains(current.hi)
                && lo.ordered(current.lo, current.hi)
            {
                return None;
            }
        }
        Some(Arc::new(lo, hi).normalised())
    }
}
