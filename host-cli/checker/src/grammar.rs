//! What follows what in an item, common to both ways of writing: `FORMAT.md`, sections 4, 5 and 8.

use crate::proof::{Claim, Feature, Place, Quantity, Relation, Rule, Step};

/// Names of the relations and then of the other rules; the place is the number.
pub const NAMES: [&str; 51] = [
    "turn.x", "turn.y", "turn.z", "back.x", "back.y", "turn.s", "plane-", "plane+", "height-",
    "height+", "dot", "cross", "circle", "slide.x", "slide.y", "slide.z", "length", "out.x",
    "out.y", "out.z", "in.x", "in.y", "in.z", "far", "near", "shift.x", "shift.y", "shift.z",
    "close.x", "close.y", "close.z", "open.x", "open.y", "open.z", "rigid", "pair.s", "pair.z",
    "trace", "cone", "along", "along.d", "aim", "sum", "cosine", "sine", "angle", "angle.c",
    "sector", "spread", "spread.k", "tilt",
];
/// Number of `sum`, the first that is no relation.
const SUM: u8 = 42;

/// Why something written is no proof.
#[derive(Clone, Copy, Debug, PartialEq, Eq, thiserror::Error)]
pub enum Malformed {
    /// It ends too early.
    #[error("ends too early")]
    Short,
    /// Something follows the end.
    #[error("something follows the end")]
    Trailing,
    /// Longer than any proof should be.
    #[error("too long")]
    Long,
    /// Does not begin like a proof of this version.
    #[error("not a proof of a known version")]
    Version,
    /// The digest at the end is not that of what stands before it.
    #[error("damaged: the digest does not fit")]
    Digest,
    /// A number is not written in the shortest way or out of range.
    #[error("a number is not well written or out of range")]
    Number,
    /// No text, or text with a line break.
    #[error("a text is not well written")]
    Text,
    /// No such rule, feature, place, quantity or claim.
    #[error("an unknown word or code")]
    Unknown,
    /// The upper end of an interval is below the lower one.
    #[error("an interval is reversed")]
    Reversed,
    /// Only a sum that ends a branch may leave out its quantity.
    #[error("a step needs a quantity")]
    Quantity,
}

/// Reads the parts of an item in order.
pub trait Reader {
    /// Number of a joint, link, cone or variable.
    fn index(&mut self) -> Result<u8, Malformed>;
    /// A feature.
    fn feature(&mut self) -> Result<Feature, Malformed>;
    /// A place.
    fn place(&mut self) -> Result<Place, Malformed>;
    /// A rule's number.
    fn rule(&mut self) -> Result<u8, Malformed>;
    /// The relations of a sum, each read by [`relation`].
    fn list(&mut self) -> Result<Vec<(i64, Relation)>, Malformed>;
}

/// Writes the parts of an item in order.
pub trait Writer {
    /// Number of a joint, link, cone or variable.
    fn index(&mut self, index: u8);
    /// A feature.
    fn feature(&mut self, feature: Feature) -> Result<(), Malformed>;
    /// A place.
    fn place(&mut self, place: Place) -> Result<(), Malformed>;
    /// A rule's number.
    fn rule(&mut self, number: u8);
    /// How many relations a sum has.
    fn count(&mut self, count: usize);
    /// A whole number.
    fn integer(&mut self, number: i64);
}

/// The relation `number` with the arguments that follow.
pub fn relation(number: u8, from: &mut impl Reader) -> Result<Relation, Malformed> {
    use Relation as R;
    Ok(match number {
        0..=2 => R::Turn(number, from.index()?, from.feature()?),
        3..=4 => R::Back(number - 3, from.index()?, from.feature()?),
        5 => R::TurnSquare(from.index()?, from.feature()?),
        6 => R::PlaneBefore(from.index()?, from.feature()?),
        7 => R::PlaneAfter(from.index()?, from.feature()?),
        8 => R::HeightBefore(from.index()?, from.feature()?),
        9 => R::HeightAfter(from.index()?, from.feature()?),
        10 => R::Dot(from.index()?, from.feature()?),
        11 => R::Cross(from.index()?, from.feature()?),
        12 => R::Circle(from.index()?),
        13..=15 => R::Slide(number - 13, from.index()?, from.feature()?),
        16 => R::Length(from.place()?, from.feature()?),
        17..=19 => R::Out(number - 17, from.index()?, from.feature()?),
        20..=22 => R::In(number - 20, from.index()?, from.feature()?),
        23 => R::Far(from.index()?, from.feature()?),
        24 => R::Near(from.index()?, from.feature()?),
        25..=27 => R::Shift(number - 25, from.feature()?),
        28..=30 => R::Close(number - 28, from.feature()?),
        31..=33 => R::Open(number - 31, from.feature()?),
        34 => R::Rigid(from.feature()?),
        35 => R::PairSquare(from.index()?, from.index()?),
        36 => R::PairAxis(from.index()?, from.index()?),
        37 => R::Trace,
        38 => R::Cone(from.index()?),
        39 => R::Along(from.index()?, from.feature()?),
        40 => R::AlongDifference(from.index()?, from.feature()?),
        41 => R::Aim(from.index()?, from.feature()?),
        _ => return Err(Malformed::Unknown),
    })
}

/// The rule `number` with the arguments that follow.
pub fn rule(number: u8, from: &mut impl Reader) -> Result<Rule, Malformed> {
    Ok(match number {
        0..SUM => Rule::One(relation(number, from)?),
        SUM => Rule::Sum(from.list()?),
        43 => Rule::Cosine(from.index()?),
        44 => Rule::Sine(from.index()?),
        45 => Rule::Angle(from.index()?, from.feature()?),
        46 => Rule::AngleOfCircle(from.index()?),
        47 => Rule::Sector(from.index()?, from.feature()?),
        48 => Rule::Spread(from.feature()?),
        49 => Rule::SpreadCone(from.index()?, from.feature()?),
        50 => Rule::Tilt(from.index()?),
        _ => return Err(Malformed::Unknown),
    })
}

/// Whether both forms can hold `text` as a target: one JSON object in one line, nothing around it.
pub fn need_target(text: &str) -> Result<(), Malformed> {
    let one = text.starts_with('{') && text.trim() == text && !text.contains(['\n', '\r']);
    let json = || serde_json::from_str::<&serde_json::value::RawValue>(text).is_ok();
    if one && json() {
        Ok(())
    } else {
        Err(Malformed::Text)
    }
}

/// The number of `first + axis`, if there are that many axes.
fn nth(first: u8, axis: u8, axes: u8) -> Result<u8, Malformed> {
    if axis < axes {
        Ok(first + axis)
    } else {
        Err(Malformed::Unknown)
    }
}

/// Writes a relation's number and arguments.
pub fn write_relation(relation: &Relation, to: &mut impl Writer) -> Result<(), Malformed> {
    to.rule(relation_number(relation)?);
    relation_arguments(relation, to)
}

fn relation_number(relation: &Relation) -> Result<u8, Malformed> {
    use Relation as R;
    Ok(match *relation {
        R::Turn(axis, ..) => nth(0, axis, 3)?,
        R::Back(axis, ..) => nth(3, axis, 2)?,
        R::TurnSquare(..) => 5,
        R::PlaneBefore(..) => 6,
        R::PlaneAfter(..) => 7,
        R::HeightBefore(..) => 8,
        R::HeightAfter(..) => 9,
        R::Dot(..) => 10,
        R::Cross(..) => 11,
        R::Circle(..) => 12,
        R::Slide(axis, ..) => nth(13, axis, 3)?,
        R::Length(..) => 16,
        R::Out(axis, ..) => nth(17, axis, 3)?,
        R::In(axis, ..) => nth(20, axis, 3)?,
        R::Far(..) => 23,
        R::Near(..) => 24,
        R::Shift(axis, ..) => nth(25, axis, 3)?,
        R::Close(axis, ..) => nth(28, axis, 3)?,
        R::Open(axis, ..) => nth(31, axis, 3)?,
        R::Rigid(..) => 34,
        R::PairSquare(..) => 35,
        R::PairAxis(..) => 36,
        R::Trace => 37,
        R::Cone(..) => 38,
        R::Along(..) => 39,
        R::AlongDifference(..) => 40,
        R::Aim(..) => 41,
    })
}

fn relation_arguments(relation: &Relation, to: &mut impl Writer) -> Result<(), Malformed> {
    use Relation as R;
    match *relation {
        R::Turn(_, index, feature)
        | R::Back(_, index, feature)
        | R::TurnSquare(index, feature)
        | R::PlaneBefore(index, feature)
        | R::PlaneAfter(index, feature)
        | R::HeightBefore(index, feature)
        | R::HeightAfter(index, feature)
        | R::Dot(index, feature)
        | R::Cross(index, feature)
        | R::Slide(_, index, feature)
        | R::Out(_, index, feature)
        | R::In(_, index, feature)
        | R::Far(index, feature)
        | R::Near(index, feature)
        | R::Along(index, feature)
        | R::AlongDifference(index, feature)
        | R::Aim(index, feature) => {
            to.index(index);
            to.feature(feature)
        }
        R::Circle(index) | R::Cone(index) => {
            to.index(index);
            Ok(())
        }
        R::Length(place, feature) => {
            to.place(place)?;
            to.feature(feature)
        }
        R::Shift(_, feature) | R::Close(_, feature) | R::Open(_, feature) | R::Rigid(feature) => {
            to.feature(feature)
        }
        R::PairSquare(i, j) | R::PairAxis(i, j) => {
            to.index(i);
            to.index(j);
            Ok(())
        }
        R::Trace => Ok(()),
    }
}

/// Number of a rule.
pub fn rule_number(rule: &Rule) -> Result<u8, Malformed> {
    Ok(match rule {
        Rule::One(relation) => relation_number(relation)?,
        Rule::Sum(_) => SUM,
        Rule::Cosine(_) => 43,
        Rule::Sine(_) => 44,
        Rule::Angle(..) => 45,
        Rule::AngleOfCircle(_) => 46,
        Rule::Sector(..) => 47,
        Rule::Spread(_) => 48,
        Rule::SpreadCone(..) => 49,
        Rule::Tilt(_) => 50,
    })
}

/// Writes what follows a rule's number.
pub fn rule_arguments(rule: &Rule, to: &mut impl Writer) -> Result<(), Malformed> {
    match rule {
        Rule::One(relation) => relation_arguments(relation, to),
        Rule::Sum(list) => {
            to.count(list.len());
            for (multiplier, relation) in list {
                to.integer(*multiplier);
                write_relation(relation, to)?;
            }
            Ok(())
        }
        Rule::Cosine(index)
        | Rule::Sine(index)
        | Rule::AngleOfCircle(index)
        | Rule::Tilt(index) => {
            to.index(*index);
            Ok(())
        }
        Rule::Angle(index, feature)
        | Rule::Sector(index, feature)
        | Rule::SpreadCone(index, feature) => {
            to.index(*index);
            to.feature(*feature)
        }
        Rule::Spread(feature) => to.feature(*feature),
    }
}

/// Refuses a step that lacks a quantity it needs, or counts one from zero.
pub fn need_quantity(step: &Step) -> Result<(), Malformed> {
    use Quantity as Q;
    match (&step.quantity, &step.rule, &step.claim) {
        (
            Some(
                Q::Variable(0)
                | Q::Value(0)
                | Q::Cosine(0)
                | Q::Sine(0)
                | Q::Radius(_, 0)
                | Q::Along(_, 0)
                | Q::Aim(_, 0),
            ),
            ..,
        ) => Err(Malformed::Number),
        (Some(_), ..) | (None, Rule::Sum(_), Claim::Nothing) => Ok(()),
        _ => Err(Malformed::Quantity),
    }
}
