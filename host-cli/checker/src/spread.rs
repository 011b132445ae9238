//! Rules from an orientation or an axis that is known within an angle.

use core::array::from_fn;

use dashu_int::IBig;

use crate::check::Reason;
use crate::exact::interval::{Interval, ONE, ceil, root_ceil};
use crate::known::Known;
use crate::problem::{Problem, axis_of};
use crate::proof::{Feature, Part, Place, Quantity};
use crate::space::{self, Vector};
use crate::wanted::Angle;

/// Range of `D . x` for unit vectors D within `angle` of a unit vector u with `u . x` in `inner` and
/// `x . x` in `square`.
fn bound(inner: &Interval, square: &Interval, angle: &Angle) -> Interval {
    Interval::new(
        -most(&-&inner.lo, &square.hi, angle),
        most(&inner.hi, &square.hi, angle),
    )
}

/// Upper bound of `D . x` for `u . x = inner`, grains.
///
/// With `r = |x|` and `inner = r cos(phi)` it is `r cos(max(phi - angle, 0))`, which rises with r and
/// with `inner`. Since r is always a bound, it may stand in when it is open which case holds.
fn most(inner: &IBig, square: &IBig, angle: &Angle) -> IBig {
    let square = square * &ONE;
    let radius = root_ceil(&square);
    if *inner < -&radius {
        return -radius;
    }
    let product = inner * &ONE;
    if product >= &radius * &angle.cosine.lo {
        return radius;
    }
    let across = root_ceil(&(square - inner * inner));
    let along = (inner * &angle.cosine.lo).max(inner * &angle.cosine.hi);
    ceil(&(along + across * &angle.sine.hi), &ONE).min(radius)
}

fn vector(known: &Known, feature: Feature, place: Place) -> Vector {
    [Part::X, Part::Y, Part::Z].map(|part| known.get(Quantity::View(feature, place, part)))
}

fn square(known: &Known, feature: Feature, place: Place) -> Interval {
    known.get(Quantity::View(feature, place, Part::Square))
}

/// A component of the feature seen from the tip, from its view along the base's axes, or back.
pub fn spread(
    problem: &Problem,
    known: &Known,
    feature: Feature,
    quantity: Quantity,
) -> Result<Interval, Reason> {
    let wanted = problem.wanted.orientation.as_ref();
    let (rotation, angle) = wanted.ok_or(Reason::NoSuch)?;
    if !problem.has_feature(feature) {
        return Err(Reason::NoSuch);
    }
    let Quantity::View(seen, place, part) = quantity else {
        return Err(Reason::NotInRelation);
    };
    let axis = axis_of(part).ok_or(Reason::NotInRelation)?;
    let (unit, from): (Vector, _) = match place {
        Place::End => (from_fn(|i| rotation[i][axis].clone()), Place::Difference),
        Place::Difference => (rotation[axis].clone(), Place::End),
        _ => return Err(Reason::NotInRelation),
    };
    if seen != feature {
        return Err(Reason::NotInRelation);
    }
    let inner = space::dot(&unit, &vector(known, feature, from));
    Ok(bound(&inner, &square(known, feature, from), angle))
}

/// A feature's inner product with one of a cone's axes from the one with the other.
pub fn spread_cone(
    problem: &Problem,
    known: &Known,
    cone: u8,
    feature: Feature,
    quantity: Quantity,
) -> Result<Interval, Reason> {
    let angle = &problem.cone(cone).ok_or(Reason::NoSuch)?.within;
    if !problem.has_feature(feature) {
        return Err(Reason::NoSuch);
    }
    let (along, aim) = (Quantity::Along(feature, cone), Quantity::Aim(feature, cone));
    if quantity == along {
        let square = square(known, feature, Place::Difference);
        Ok(bound(&known.get(aim), &square, angle))
    } else if quantity == aim {
        let square = square(known, feature, Place::End);
        Ok(bound(&known.get(along), &square, angle))
    } else {
        Err(Reason::NotInRelation)
    }
}

/// A component of a cone's axis seen from the base.
pub fn tilt(problem: &Problem, cone: u8, quantity: Quantity) -> Result<Interval, Reason> {
    let wanted = problem.cone(cone).ok_or(Reason::NoSuch)?;
    let Quantity::View(Feature::Cone(seen), Place::Base, part) = quantity else {
        return Err(Reason::NotInRelation);
    };
    let axis = axis_of(part).ok_or(Reason::NotInRelation)?;
    if seen != cone {
        return Err(Reason::NotInRelation);
    }
    Ok(bound(&wanted.base[axis], &Interval::one(), &wanted.within))
}
