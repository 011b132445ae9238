//! Intervals of doubles; what rounds is widened where a bound is claimed.

/// A closed interval.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Interval {
    pub lo: f64,
    pub hi: f64,
}

impl Interval {
    pub fn new(lo: f64, hi: f64) -> Interval {
        Interval { lo, hi }
    }

    pub fn point(value: f64) -> Interval {
        Interval::new(value, value)
    }

    pub fn width(self) -> f64 {
        self.hi - self.lo
    }

    pub fn middle(self) -> f64 {
        0.5 * (self.lo + self.hi)
    }

    pub fn magnitude(self) -> f64 {
        self.hi.max(-self.lo)
    }

    pub fn widened(self, by: f64) -> Interval {
        Interval::new(self.lo - by, self.hi + by)
    }

    pub fn plus(self, other: Interval) -> Interval {
        Interval::new(self.lo + other.lo, self.hi + other.hi)
    }

    pub fn minus(self, other: Interval) -> Interval {
        Interval::new(self.lo - other.hi, self.hi - other.lo)
    }

    pub fn scale(self, factor: f64) -> Interval {
        let (a, b) = (self.lo * factor, self.hi * factor);
        Interval::new(a.min(b), a.max(b))
    }

    pub fn times(self, other: Interval) -> Interval {
        let (a, b) = (self.lo * other.lo, self.lo * other.hi);
        let (c, d) = (self.hi * other.lo, self.hi * other.hi);
        Interval::new(a.min(b).min(c.min(d)), a.max(b).max(c.max(d)))
    }

    pub fn square(self) -> Interval {
        let (a, b) = (self.lo * self.lo, self.hi * self.hi);
        let lo = if self.lo <= 0.0 && self.hi >= 0.0 {
            0.0
        } else {
            a.min(b)
        };
        Interval::new(lo, a.max(b))
    }

    /// `None` when the divisor holds zero.
    pub fn over(self, divisor: Interval) -> Option<Interval> {
        (divisor.lo > 0.0 || divisor.hi < 0.0)
            .then(|| self.times(Interval::new(1.0 / divisor.hi, 1.0 / divisor.lo)))
    }

    pub fn meet(self, other: Interval) -> Interval {
        Interval::new(self.lo.max(other.lo), self.hi.min(other.hi))
    }

    /// Range of the cosine.
    pub fn cosine(self) -> Interval {
        use std::f64::consts::{PI, TAU};
        if self.width() >= TAU {
            return Interval::new(-1.0, 1.0);
        }
        let (a, b) = (self.lo.cos(), self.hi.cos());
        let holds = |angle: f64| {
            let turns = ((self.lo - angle) / TAU).ceil();
            angle + turns * TAU <= self.hi
        };
        Interval::new(
            if holds(PI) { -1.0 } else { a.min(b) },
            if holds(0.0) { 1.0 } else { a.max(b) },
        )
    }

    /// Range of the sine.
    pub fn sine(self) -> Interval {
        let quarter = std::f64::consts::FRAC_PI_2;
        Interval::new(self.lo - quarter, self.hi - quarter).cosine()
    }
}

/// The directions of a box that keeps away from the origin, as an interval of angles below pi wide.
pub(crate) fn directions(x: Interval, y: Interval) -> Option<Interval> {
    let angle = |x: f64, y: f64| y.atan2(x);
    let corners = |a: (f64, f64), b: (f64, f64)| {
        let lo = angle(a.0, a.1);
        let width = (angle(b.0, b.1) - lo).rem_euclid(std::f64::consts::TAU);
        // The same corner twice may come out just below itself.
        let width = if width > std::f64::consts::PI {
            0.0
        } else {
            width
        };
        Some(Interval::new(lo, lo + width))
    };
    // Too near to zero to tell a direction.
    const LEAST: f64 = 1e-9;
    if x.lo > LEAST {
        corners(
            (if y.lo >= 0.0 { x.hi } else { x.lo }, y.lo),
            (if y.hi >= 0.0 { x.lo } else { x.hi }, y.hi),
        )
    } else if x.hi < -LEAST {
        corners(
            (if y.hi >= 0.0 { x.hi } else { x.lo }, y.hi),
            (if y.lo >= 0.0 { x.lo } else { x.hi }, y.lo),
        )
    } else if y.lo > LEAST {
        corners((x.hi, y.lo), (x.lo, y.lo))
    } else if y.hi < -LEAST {
        corners((x.lo, y.hi), (x.hi, y.hi))
    } else {
        None
    }
}
