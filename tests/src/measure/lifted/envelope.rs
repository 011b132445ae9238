//! Linear estimators of products and squares over boxes, in exact integers.

use balk_core::fixed::{Arc, Direction, FRACTION_BITS, Interval, root_up};

/// `of_x * x + of_y * y + constant`: coefficients with 30 fraction bits, the constant with 60.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Plane {
    /// Coefficient of the first factor.
    pub of_x: i32,
    /// Coefficient of the second factor.
    pub of_y: i32,
    /// The rest.
    pub constant: i64,
}

impl Plane {
    /// Value at a point with 30 fraction bits; 60 fraction bits.
    pub fn at(&self, x: i32, y: i32) -> i64 {
        self.of_x as i64 * x as i64 + self.of_y as i64 * y as i64 + self.constant
    }
}

/// The facet of the envelope of `x y` over a box that is tightest at a point of it: nowhere below
/// the product in the box when `above`, nowhere above it otherwise.
///
/// Exact, without rounding. Source: McCormick, *Computability of global solutions to factorable
/// nonconvex programs: Part I*, Mathematical Programming 10, 1976, 147-175.
pub fn product(x: Interval, y: Interval, at: (i32, i32), above: bool) -> Plane {
    let facet = |x: i32, y: i32| Plane {
        of_x: y,
        of_y: x,
        constant: -(x as i64 * y as i64),
    };
    let (one, other) = if above {
        (facet(x.hi, y.lo), facet(x.lo, y.hi))
    } else {
        (facet(x.lo, y.lo), facet(x.hi, y.hi))
    };
    if (one.at(at.0, at.1) <= other.at(at.0, at.1)) == above {
        one
    } else {
        other
    }
}

/// `slope * x + constant`: 30 and 60 fraction bits.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Line {
    /// Coefficient; up to two in size.
    pub slope: i64,
    /// The rest.
    pub constant: i64,
}

impl Line {
    /// Value at a point with 30 fraction bits; 60 fraction bits.
    pub fn at(&self, x: i32) -> i64 {
        self.slope * x as i64 + self.constant
    }
}

/// The secant of `x^2` over an interval: nowhere below the square in it. Exact.
pub fn secant(x: Interval) -> Line {
    Line {
        slope: x.lo as i64 + x.hi as i64,
        constant: -(x.lo as i64 * x.hi as i64),
    }
}

/// The tangent of `x^2` at a point: nowhere above the square. Exact.
pub fn tangent(at: i32) -> Line {
    Line {
        slope: 2 * at as i64,
        constant: -(at as i64 * at as i64),
    }
}

/// The chord of an arc: a direction and the least inner product (60 fraction bits) that any cosine
/// and sine of the arc has with it. `None` for every angle.
///
/// The inner product falls with the angle from the direction up to half a turn, so it is least at
/// an end; an end's components may each lie 6 units off.
pub fn chord(arc: Arc) -> Option<(Direction, i64)> {
    if arc.full {
        return None;
    }
    let middle = arc.middle();
    let least = arc.lo.dot(middle).min(arc.hi.dot(middle));
    Some((middle, least - (12 << FRACTION_BITS)))
}

/// The greatest inner product (60 fraction bits) of a vector with any vector of at most unit length:
/// the tangent of the sphere in its direction. Rounded up; at most three components.
pub fn sphere_tangent(vector: &[i32]) -> i64 {
    root_up(vector.iter().map(|&v| v as i64 * v as i64).sum()) << FRACTION_BITS
}
