//! The trusted kernel: integer multipliers in, a proof of emptiness out.
//!
//! Real unknowns `x_0, x_1, ...` lie in boxes and must satisfy rows `lower <= sum_k c_k x_k <= upper`.
//! Multiplying each row by an integer and adding gives one inequality `sum_j L_j x_j <= B` that every
//! solution satisfies. If its left side is larger than `B` wherever the boxes allow, no solution exists
//! (Farkas, *Theorie der einfachen Ungleichungen*, J. reine angew. Math. 124, 1902). What the multipliers
//! fail to cancel is absorbed by the boxes, so rounded multipliers are as good as exact ones (Neumaier and
//! Shcherbina, *Safe bounds in linear and mixed-integer linear programming*, Math. Program. 99, 2004).
//!
//! Whoever proposes the multipliers need not be trusted; whoever states the rows and boxes must be. The
//! rows are handed over one at a time, so a caller rebuilds each from its identity in a small buffer.
//! Nothing here uses floats, heap, recursion or another module, and nothing panics. Arithmetic is exact:
//!
//! - a left-over is kept in `i64`. One product `i32 * i32` is at most 2^62 in magnitude and always fits;
//!   sums are checked.
//! - right sides and box contributions are kept in `i128`. One product `i64 * i64` is at most 2^126 and
//!   always fits; sums are checked.
//!
//! A failed check is [`Unproved::Overflow`], never a proof.
#![deny(
    clippy::arithmetic_side_effects,
    clippy::as_conversions,
    clippy::expect_used,
    clippy::float_arithmetic,
    clippy::indexing_slicing,
    clippy::panic,
    clippy::unwrap_used
)]

/// A set of allowed values: all, a half line, or an interval with its ends.
///
/// An absent side is a case of its own and not a large number. An interval whose ends are the wrong way
/// round is the empty set.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct Range {
    /// Least allowed value, if there is one.
    pub lower: Option<i64>,
    /// Greatest allowed value, if there is one.
    pub upper: Option<i64>,
}

impl Range {
    /// Every value.
    pub const FREE: Self = Self {
        lower: None,
        upper: None,
    };

    /// Values not below `lower`.
    pub const fn at_least(lower: i64) -> Self {
        Self {
            lower: Some(lower),
            upper: None,
        }
    }

    /// Values not above `upper`.
    pub const fn at_most(upper: i64) -> Self {
        Self {
            lower: None,
            upper: Some(upper),
        }
    }

    /// Values from `lower` to `upper`, both included.
    pub const fn between(lower: i64, upper: i64) -> Self {
        Self {
            lower: Some(lower),
            upper: Some(upper),
        }
    }

    /// The one value `value`.
    pub const fn exactly(value: i64) -> Self {
        Self::between(value, value)
    }
}

/// One coefficient of a row.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct Term {
    /// Which unknown, counted from 0.
    pub unknown: u16,
    /// What it is multiplied by. Terms of the same unknown add up.
    pub coefficient: i32,
}

/// The requirement that a linear form lies in a range.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct Row<'a> {
    /// The linear form.
    pub terms: &'a [Term],
    /// Where its value must lie.
    pub range: Range,
}

/// Evidence that a system of rows and boxes has no solution.
///
/// Only [`Combination::refute`] makes one, and it can neither be copied nor cloned, so a function that
/// asks for it cannot be reached without a proof:
///
/// ```compile_fail,E0451
/// let forged = balk_core::certificate::Refuted { _only_made_here: () };
/// ```
#[derive(Debug)]
#[must_use]
pub struct Refuted {
    _only_made_here: (),
}

/// Why a combination of rows proves nothing.
///
/// None of these says that a solution exists.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum Unproved {
    /// A multiplier uses a side of a row that the row does not have.
    MissingSide,
    /// The combined inequality can be met within the boxes, with this much to spare (0 or more), in units
    /// of multiplier times right side.
    NotStrict {
        /// Right side minus the least value of the left side.
        slack: i128,
    },
    /// A sum left the range of its integer type.
    Overflow,
    /// An unknown has a left-over of a sign for which its box is unbounded.
    Unbounded,
    /// A term names an unknown beyond the left-overs, or fewer boxes than left-overs were given.
    UnknownOutOfRange,
}

impl core::fmt::Display for Unproved {
    fn fmt(&self, formatter: &mut core::fmt::Formatter<'_>) -> core::fmt::Result {
        match self {
            Self::MissingSide => {
                formatter.write_str("a multiplier uses a side its row does not have")
            }
            Self::NotStrict { slack } => {
                write!(formatter, "the combined row can be met, slack {slack}")
            }
            Self::Overflow => formatter.write_str("a sum does not fit its integer type"),
            Self::Unbounded => formatter.write_str("a left-over falls on an unbounded side"),
            Self::UnknownOutOfRange => {
                formatter.write_str("a row or box names an unknown that does not exist")
            }
        }
    }
}

impl core::error::Error for Unproved {}

/// A sum of rows, each times an integer: the inequality `sum_j L_j x_j <= B`.
///
/// Adding consumes the combination and gives it back only when it is still exact, so one that failed
/// half-way cannot be used.
///
/// ```
/// use balk_core::certificate::{Combination, Range, Row, Term};
///
/// // x + y >= 5 with x and y in [0, 2].
/// let terms = [Term { unknown: 0, coefficient: 1 }, Term { unknown: 1, coefficient: 1 }];
/// let row = Row { terms: &terms, range: Range::at_least(5) };
/// let mut left_overs = [0; 2];
/// let proof = Combination::new(&mut left_overs)
///     .add(-1, row)
///     .and_then(|sum| sum.refute([Range::between(0, 2); 2]));
/// assert!(proof.is_ok());
/// ```
#[derive(Debug)]
#[must_use]
pub struct Combination<'a> {
    left_overs: &'a mut [i64],
    right_side: i128,
}

impl<'a> Combination<'a> {
    /// The empty sum `0 <= 0`. `left_overs` is working memory, one entry per unknown; it is cleared first.
    pub fn new(left_overs: &'a mut [i64]) -> Self {
        left_overs.fill(0);
        Self {
            left_overs,
            right_side: 0,
        }
    }

    /// Adds `multiplier` times `row`: a positive multiplier uses the row's upper side, a negative one its
    /// lower side, 0 neither.
    ///
    /// Costs one multiplication per term.
    ///
    /// # Errors
    /// [`Unproved::MissingSide`], [`Unproved::UnknownOutOfRange`] or [`Unproved::Overflow`].
    pub fn add(mut self, multiplier: i32, row: Row<'_>) -> Result<Self, Unproved> {
        let side = match multiplier {
            0 => return Ok(self),
            1.. => row.range.upper,
            _ => row.range.lower,
        };
        let side = side.ok_or(Unproved::MissingSide)?;
        self.right_side = add_product(self.right_side, i64::from(multiplier), side)?;
        for term in row.terms {
            let left_over = self
                .left_overs
                .get_mut(usize::from(term.unknown))
                .ok_or(Unproved::UnknownOutOfRange)?;
            *left_over = i64::from(multiplier)
                .checked_mul(i64::from(term.coefficient))
                .and_then(|product| left_over.checked_add(product))
                .ok_or(Unproved::Overflow)?;
        }
        Ok(self)
    }

    /// Decides whether the combined inequality is impossible within the boxes, one per unknown in order.
    ///
    /// A positive left-over takes the lower end of its box, a negative one the upper end, 0 neither.
    /// Boxes beyond the left-overs are not looked at. Costs one multiplication per unknown.
    ///
    /// # Errors
    /// Any [`Unproved`] except [`Unproved::MissingSide`]; then nothing is known.
    pub fn refute(self, boxes: impl IntoIterator<Item = Range>) -> Result<Refuted, Unproved> {
        let mut boxes = boxes.into_iter();
        let mut least: i128 = 0;
        for &left_over in self.left_overs.iter() {
            let range = boxes.next().ok_or(Unproved::UnknownOutOfRange)?;
            let end = match left_over {
                0 => continue,
                1.. => range.lower,
                _ => range.upper,
            };
            least = add_product(least, left_over, end.ok_or(Unproved::Unbounded)?)?;
        }
        let slack = self
            .right_side
            .checked_sub(least)
            .ok_or(Unproved::Overflow)?;
        if slack < 0 {
            Ok(Refuted {
                _only_made_here: (),
            })
        } else {
            Err(Unproved::NotStrict { slack })
        }
    }
}

/// `sum + a * b`, exactly.
fn add_product(sum: i128, a: i64, b: i64) -> Result<i128, Unproved> {
    i128::from(a)
        .checked_mul(i128::from(b))
        .and_then(|product| sum.checked_add(product))
        .ok_or(Unproved::Overflow)
}
