//! Sets of angles between two rays.

use super::direction::DIRECTION_SLACK;
use super::{Direction, Empty, Interval, ONE};

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
        let mut bounds = Interval::clamped(a.min(b) - DIRECTION_SLACK, a.max(b) + DIRECTION_SLACK);
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
        if sum.0.abs().max(sum.1.abs()) < (ONE >> 4) as i64
            && (across != 0 || self.lo.dot(self.hi) < 0)
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
        (Arc::new(self.lo, middle), Arc::new(middle, self.hi))
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
