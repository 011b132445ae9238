//! What a step's rule says of its quantity: `FORMAT.md`, section 5.

use dashu_int::{IBig, Sign};

use crate::arc;
use crate::check::Reason;
use crate::combine;
use crate::exact::function;
use crate::exact::interval::{Interval, ONE, ceil, floor, root_ceil, root_floor};
use crate::known::Known;
use crate::problem::Problem;
use crate::proof::{Quantity, Relation, Rule};
use crate::relation::{Monomial, Term, Unit, polynomial};
use crate::spread;

/// Where the rule of a step confines `quantity`, from what is known. Empty if nowhere.
///
/// # Errors
///
/// The rule does not apply.
pub fn confine(
    problem: &Problem,
    known: &Known,
    rule: &Rule,
    quantity: Option<Quantity>,
) -> Result<Interval, Reason> {
    if let Rule::Sum(list) = rule {
        return combine::sum(problem, known, list, quantity);
    }
    let quantity = quantity.ok_or(Reason::NotInRelation)?;
    let revolute = |joint| {
        problem
            .is_revolute(joint)
            .then_some(())
            .ok_or(Reason::NoSuch)
    };
    match *rule {
        Rule::One(relation) => solve(problem, known, relation, quantity),
        Rule::Cosine(joint) => {
            revolute(joint)?;
            only(quantity, Quantity::Cosine(joint))?;
            Ok(function::cosine(&known.get(Quantity::Value(joint))))
        }
        Rule::Sine(joint) => {
            revolute(joint)?;
            only(quantity, Quantity::Sine(joint))?;
            Ok(function::sine(&known.get(Quantity::Value(joint))))
        }
        Rule::Angle(joint, feature) => {
            revolute(joint)?;
            problem
                .has_feature(feature)
                .then_some(())
                .ok_or(Reason::NoSuch)?;
            only(quantity, Quantity::Value(joint))?;
            arc::angle(known, joint, feature)
        }
        Rule::AngleOfCircle(joint) => {
            revolute(joint)?;
            only(quantity, Quantity::Value(joint))?;
            arc::angle_of_circle(known, joint)
        }
        Rule::Sector(joint, feature) => {
            revolute(joint)?;
            problem
                .has_feature(feature)
                .then_some(())
                .ok_or(Reason::NoSuch)?;
            arc::sector(known, joint, feature, quantity)
        }
        Rule::Spread(feature) => spread::spread(problem, known, feature, quantity),
        Rule::SpreadCone(cone, feature) => {
            spread::spread_cone(problem, known, cone, feature, quantity)
        }
        Rule::Tilt(cone) => spread::tilt(problem, cone, quantity),
        Rule::Sum(_) => Err(Reason::NoSuch),
    }
}

fn only(quantity: Quantity, wanted: Quantity) -> Result<(), Reason> {
    if quantity == wanted {
        Ok(())
    } else {
        Err(Reason::NotInRelation)
    }
}

/// Values of a monomial: of one quantity in grains divided by `lift`, of two in squared grains.
pub fn values(known: &Known, monomial: Monomial, lift: Unit) -> Interval {
    match monomial {
        Monomial::One(a) if lift == Unit::Whole => known.get(a),
        Monomial::One(a) => known.get(a).scale(&ONE),
        Monomial::Two(a, b) if a == b => known.get(a).square(),
        Monomial::Two(a, b) => known.get(a).product(&known.get(b)),
    }
}

/// How far a term may be from its middle coefficient's, in its coefficient's unit times that of
/// [`values`].
pub fn error(known: &Known, term: &Term, lift: Unit) -> IBig {
    if term.by.error.is_zero() {
        IBig::ZERO
    } else {
        &term.by.error * values(known, term.of, lift).size()
    }
}

fn solve(
    problem: &Problem,
    known: &Known,
    relation: Relation,
    quantity: Quantity,
) -> Result<Interval, Reason> {
    let sum = polynomial(problem, relation).ok_or(Reason::NoSuch)?;
    // Grains times the coefficients' unit, times 10^24 if a product of two quantities is there.
    let lift = if sum.has_products() {
        Unit::Grain
    } else {
        Unit::Whole
    };
    let unit = sum.unit.one() * lift.one();
    let mut rest = sum.range.scale(&unit);
    let mut own = None;
    for term in &sum.terms {
        let error = error(known, term, lift);
        if !error.is_zero() {
            rest.lo -= &error;
            rest.hi += &error;
        }
        let has = match term.of {
            Monomial::One(a) => a == quantity,
            Monomial::Two(a, b) => a == quantity || b == quantity,
        };
        if !has {
            rest = &rest - &values(known, term.of, lift).scale(&term.by.middle);
        } else if own.replace(term).is_some() {
            return Err(Reason::Ambiguous);
        }
    }
    let Term { by, of } = own.ok_or(Reason::NotInRelation)?;
    let by = &by.middle;
    match *of {
        Monomial::One(_) => {
            let factor = Interval::point(by * lift.one());
            rest.over(&factor).ok_or(Reason::TouchesZero)
        }
        Monomial::Two(a, b) if a == b => roots(&rest, by, &known.get(quantity)),
        Monomial::Two(a, b) => {
            let other = if a == quantity { b } else { a };
            let factor = known.get(other).scale(by);
            rest.over(&factor).ok_or(Reason::TouchesZero)
        }
    }
}

/// Hull of the numbers x in `known` with `by x^2` in `range` (squared grains times the unit of `by`).
fn roots(range: &Interval, by: &IBig, known: &Interval) -> Result<Interval, Reason> {
    let squares = match by.sign() {
        _ if by.is_zero() => return Err(Reason::TouchesZero),
        Sign::Positive => Interval::new(floor(&range.lo, by), ceil(&range.hi, by)),
        Sign::Negative => {
            let by = -by;
            Interval::new(floor(&-&range.hi, &by), ceil(&-&range.lo, &by))
        }
    };
    if squares.hi < IBig::ZERO {
        return Ok(Interval::empty());
    }
    let sizes = Interval::new(root_floor(&squares.lo), root_ceil(&squares.hi));
    Ok(known.meet(&sizes).hull(&known.meet(&-&sizes)))
}
