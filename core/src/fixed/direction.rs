//! Rays in the plane.

use super::{FRACTION_BITS, ONE, clamp};

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
pub(super) const DIRECTION_SLACK: i64 = 6;

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
    pub(super) fn product(self, other: Direction) -> (i64, i64) {
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
    pub(super) fn shorten((x, y): (i64, i64)) -> Direction {
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
    pub(super) fn tilted(self, counter_clockwise: bool) -> Direction {
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
    pub(super) fn nearly_full(self) -> bool {
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
    pub(super) fn half(self, other: Direction) -> u8 {
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
