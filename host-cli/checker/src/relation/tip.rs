//! Relations between the base's and the tip's view, and those that the target gives.

use dashu_int::IBig;

use super::{AXES, Polynomial, constants};
use crate::exact::interval::{Interval, ONE};
use crate::problem::{Problem, is_point};
use crate::proof::{Feature, Part, Place, Quantity, Relation};
use crate::space;

/// The polynomial of `relation`; `None` if the target has no such relation, or it is none of these.
pub fn polynomial(problem: &Problem, relation: Relation) -> Option<Polynomial> {
    use Relation as R;
    let axis_seen = |m: u8, part| Quantity::View(Feature::TipAxis(m), Place::Base, part);
    match relation {
        R::Shift(axis, f) => {
            let part = *AXES.get(usize::from(axis))?;
            problem.has_feature(f).then_some(())?;
            let sum = Polynomial::zero()
                .one(1, Quantity::View(f, Place::Difference, part))
                .one(-1, Quantity::View(f, Place::Base, part));
            Some(if is_point(f) {
                sum.one(1, Quantity::View(Feature::Tip, Place::Base, part))
            } else {
                sum
            })
        }
        R::Close(axis, f) => {
            let part = *AXES.get(usize::from(axis))?;
            problem.has_feature(f).then_some(())?;
            let sum = Polynomial::zero().one(1, Quantity::View(f, Place::Difference, part));
            Some((0u8..).zip(AXES).fold(sum, |sum, (m, own)| {
                sum.two(-1, axis_seen(m, part), Quantity::View(f, Place::End, own))
            }))
        }
        R::Open(axis, f) => {
            let own = *AXES.get(usize::from(axis))?;
            problem.has_feature(f).then_some(())?;
            let sum = Polynomial::zero().one(1, Quantity::View(f, Place::End, own));
            Some(AXES.iter().fold(sum, |sum, part| {
                sum.two(
                    -1,
                    axis_seen(axis, *part),
                    Quantity::View(f, Place::Difference, *part),
                )
            }))
        }
        R::Rigid(f) => {
            problem.has_feature(f).then_some(())?;
            let seen = |place| Quantity::View(f, place, Part::Square);
            let sum = Polynomial::zero().one(1, seen(Place::Difference));
            Some(sum.one(-1, seen(Place::End)))
        }
        R::Trace => {
            let (rotation, within) = problem.wanted.orientation.as_ref()?;
            let three = IBig::from(3) * &ONE;
            let least = &ONE + IBig::from(2) * &within.cosine.lo;
            let sum = Polynomial::fine(Interval::new(least, three));
            let columns = space::transpose(rotation);
            Some((0u8..).zip(&columns).fold(sum, |sum, (m, column)| {
                let column = constants(column);
                sum.dot(1, column, |part| axis_seen(m, part))
            }))
        }
        R::Cone(k) => {
            let cone = problem.cone(k)?;
            let sum = Polynomial::fine(Interval::new(cone.within.cosine.lo.clone(), ONE.clone()));
            let seen = |part| Quantity::View(Feature::Cone(k), Place::Base, part);
            Some(sum.dot(1, constants(&cone.base), seen))
        }
        R::Along(k, f) => {
            let cone = problem.cone(k)?;
            problem.has_feature(f).then_some(())?;
            let sum = Polynomial::fine(Interval::zero()).one(1, Quantity::Along(f, k));
            let seen = |part| Quantity::View(f, Place::End, part);
            Some(sum.dot(-1, constants(&cone.tip), seen))
        }
        R::AlongDifference(k, f) => {
            problem.cone(k)?;
            problem.has_feature(f).then_some(())?;
            let sum = Polynomial::zero().one(1, Quantity::Along(f, k));
            Some(AXES.iter().fold(sum, |sum, part| {
                let axis = Quantity::View(Feature::Cone(k), Place::Base, *part);
                sum.two(-1, axis, Quantity::View(f, Place::Difference, *part))
            }))
        }
        R::Aim(k, f) => {
            let cone = problem.cone(k)?;
            problem.has_feature(f).then_some(())?;
            let sum = Polynomial::fine(Interval::zero()).one(1, Quantity::Aim(f, k));
            let seen = |part| Quantity::View(f, Place::Difference, part);
            Some(sum.dot(-1, constants(&cone.base), seen))
        }
        _ => None,
    }
}
