//! The rule `sum`: a combination of relations, bounded about the middle of what is known.

use std::collections::BTreeMap;

use dashu_int::{IBig, Sign};

use crate::check::Reason;
use crate::exact::interval::{Interval, ONE, ceil, floor};
use crate::known::Known;
use crate::problem::Problem;
use crate::proof::{Quantity, Relation};
use crate::relation::{Monomial, Unit, polynomial};
use crate::rule;

/// Twice the middle of a quantity, the width of its interval, and twice its coefficient `g`.
struct Part {
    middle: IBig,
    width: IBig,
    slope: IBig,
}

/// Where the combination of `list` confines `quantity`. Without a quantity, the result is empty if
/// the combination cannot hold, else everything: `[-1, 1]` stands for it, as nothing is narrowed.
///
/// With `z = m + d`, twice m and twice d are whole grains. Everything below is four times the
/// combination in cubed grains, so that nothing is rounded before the last division.
pub fn sum(
    problem: &Problem,
    known: &Known,
    list: &[(i64, Relation)],
    quantity: Option<Quantity>,
) -> Result<Interval, Reason> {
    let four = IBig::from(4);
    let unit = &four * &ONE * &ONE;
    let mut range = Interval::zero();
    let mut terms: BTreeMap<Monomial, IBig> = BTreeMap::new();
    for (multiplier, relation) in list {
        let multiplier = IBig::from(*multiplier);
        let part = polynomial(problem, *relation).ok_or(Reason::NoSuch)?;
        range = &range + &part.range.scale(&multiplier).scale(&unit);
        // Brings coefficients to grains.
        let factor = match part.unit {
            Unit::Whole => multiplier * &ONE,
            Unit::Grain => multiplier,
        };
        for term in &part.terms {
            let error = rule::error(known, term, Unit::Grain) * &factor * &four;
            range = &range + &Interval::around_zero(error.clone().max(-error));
            *terms.entry(term.of).or_insert(IBig::ZERO) += &factor * &term.by.middle;
        }
    }
    terms.retain(|_, by| !by.is_zero());
    let mut parts: BTreeMap<Quantity, Part> = BTreeMap::new();
    for monomial in terms.keys() {
        let (a, b) = match *monomial {
            Monomial::One(a) => (a, a),
            Monomial::Two(a, b) => (a, b),
        };
        for quantity in [a, b] {
            parts.entry(quantity).or_insert_with(|| {
                let bound = known.get(quantity);
                Part {
                    middle: &bound.lo + &bound.hi,
                    width: bound.width(),
                    slope: IBig::ZERO,
                }
            });
        }
    }
    // `range` becomes what is left for the linear part: I - p(m) - (products of differences).
    for (monomial, by) in &terms {
        match *monomial {
            Monomial::One(a) => {
                let slope = IBig::from(2) * by * &ONE;
                let part = &mut parts.get_mut(&a).ok_or(Reason::NoSuch)?;
                let value = &slope * &part.middle;
                part.slope += slope;
                range = shift(&range, &value);
            }
            Monomial::Two(a, b) => {
                if a == b && quantity == Some(a) {
                    return Err(Reason::Ambiguous);
                }
                let (one, other) = (&parts[&a], &parts[&b]);
                let value = by * &one.middle * &other.middle;
                let product = by * &one.width * &other.width;
                let slopes = (by * &other.middle, by * &one.middle);
                range = shift(&range, &value);
                range = &range
                    - &if a == b {
                        let zero = IBig::ZERO;
                        Interval::new(zero.clone().min(product.clone()), zero.max(product))
                    } else {
                        Interval::around_zero(product.clone().max(-product))
                    };
                parts.get_mut(&a).ok_or(Reason::NoSuch)?.slope += slopes.0;
                parts.get_mut(&b).ok_or(Reason::NoSuch)?.slope += slopes.1;
            }
        }
    }
    for (of, part) in &parts {
        if Some(*of) != quantity {
            let product = &part.slope * &part.width;
            range = &range - &Interval::around_zero(product.clone().max(-product));
        }
    }
    let Some(quantity) = quantity else {
        return Ok(if range.has_zero() {
            Interval::around_zero(IBig::ONE)
        } else {
            Interval::empty()
        });
    };
    let part = parts.get(&quantity).ok_or(Reason::NotInRelation)?;
    let (slope, range) = match part.slope.sign() {
        _ if part.slope.is_zero() => return Err(Reason::TouchesZero),
        Sign::Positive => (part.slope.clone(), range),
        Sign::Negative => (-&part.slope, -range),
    };
    // Twice z is twice m plus range / slope.
    let twice = IBig::from(2) * &slope;
    let middle = &part.middle * &slope;
    Ok(Interval::new(
        floor(&(&middle + &range.lo), &twice),
        ceil(&(&middle + &range.hi), &twice),
    ))
}

/// `range` less `value`.
fn shift(range: &Interval, value: &IBig) -> Interval {
    Interval::new(&range.lo - value, &range.hi - value)
}
