//! Rules about directions in the plane of a joint: `angle`, `angle.c` and `sector`.

use crate::check::Reason;
use crate::exact::function;
use crate::exact::interval::Interval;
use crate::known::Known;
use crate::proof::{Feature, Part, Place, Quantity};

/// Directions, about the joint's axis, in which the feature may be seen from `place`.
fn directions(known: &Known, feature: Feature, place: Place) -> Result<Interval, Reason> {
    let seen = |part| known.get(Quantity::View(feature, place, part));
    function::arc(&seen(Part::X), &seen(Part::Y)).ok_or(Reason::TouchesZero)
}

/// Values of the joint that turn where the feature is seen after motion to where before.
pub fn angle(known: &Known, joint: u8, feature: Feature) -> Result<Interval, Reason> {
    let before = directions(known, feature, Place::Before(joint))?;
    let after = directions(known, feature, Place::After(joint))?;
    Ok(values(
        &(&before - &after),
        &known.get(Quantity::Value(joint)),
    ))
}

/// Values of the joint whose cosine and sine are known.
pub fn angle_of_circle(known: &Known, joint: u8) -> Result<Interval, Reason> {
    let [cosine, sine] = [Quantity::Cosine(joint), Quantity::Sine(joint)].map(|q| known.get(q));
    let arc = function::arc(&cosine, &sine).ok_or(Reason::TouchesZero)?;
    Ok(values(&arc, &known.get(Quantity::Value(joint))))
}

/// Hull of the values in `bound` that are in `arc` up to whole turns.
fn values(arc: &Interval, bound: &Interval) -> Interval {
    let (first, last) = function::turns(bound, arc);
    if first > last {
        return Interval::empty();
    }
    let copy = |turns| &function::turn().scale(&turns) + arc;
    Interval::new(copy(first).lo, copy(last).hi).meet(bound)
}

/// A coordinate in the joint's plane from the distance to the axis, the direction seen from the
/// other side, and the joint's value.
pub fn sector(
    known: &Known,
    joint: u8,
    feature: Feature,
    quantity: Quantity,
) -> Result<Interval, Reason> {
    let (before, after) = (Place::Before(joint), Place::After(joint));
    let value = known.get(Quantity::Value(joint));
    let (part, direction) = match quantity {
        Quantity::View(f, place, part) if f == feature && place == before => {
            (part, &directions(known, feature, after)? + &value)
        }
        Quantity::View(f, place, part) if f == feature && place == after => {
            (part, &directions(known, feature, before)? - &value)
        }
        _ => return Err(Reason::NotInRelation),
    };
    let wave = match part {
        Part::X => function::cosine(&direction),
        Part::Y => function::sine(&direction),
        Part::Z | Part::Square => return Err(Reason::NotInRelation),
    };
    let radius = known.get(Quantity::Radius(feature, joint));
    Ok(radius
        .scale(&crate::exact::interval::ONE)
        .root()
        .times(&wave))
}
