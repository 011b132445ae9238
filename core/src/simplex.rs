//! Fixed-capacity feasibility simplex that proposes multipliers and decides nothing.
//!
//! The question is whether some point of the boxes meets every row, so there is no objective. A dense
//! tableau writes each basic variable as a linear form in the nonbasic ones, all with bounds. A basic
//! variable outside its bounds is repaired by exchanging it with a nonbasic one that can move; when the
//! nonbasic ones together cannot move it far enough, its tableau row is a Farkas certificate (Dutertre and
//! de Moura, *A fast linear-arithmetic solver for DPLL(T)*, CAV 2006, LNCS 4144, 81-94; Farkas 1902).
//!
//! Rows and boxes are the integer ones of [`certificate`](crate::certificate); floating point is inside
//! only, and integer multipliers come out. **No answer of this module is evidence**: give the multipliers
//! to a [`Combination`](crate::certificate::Combination).
//!
//! Rows and unknowns are scaled by powers of two. An unknown bounded on both sides is scaled to size 1;
//! one with an open side is taken as it is.

mod real;
mod tableau;

pub use real::Real;

use crate::certificate::{Range, Row};
use tableau::{Tableau, Variable};

/// What [`Simplex::solve`] came to. None of these is a proof.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
#[must_use]
pub enum Outcome {
    /// All rows and boxes are met within rounding by the point [`Simplex::value`] reads.
    Feasible,
    /// Some row cannot be met; [`Simplex::multipliers`] says why.
    Infeasible,
    /// The pivot budget ran out.
    OutOfPivots,
    /// A value left the range of the floating-point type.
    Unstable,
}

/// Why a row was not added. The simplex is as it was before.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum RowRejected {
    /// All row places are taken.
    Full,
    /// A term names an unknown that does not exist.
    UnknownOutOfRange,
}

impl core::fmt::Display for RowRejected {
    fn fmt(&self, formatter: &mut core::fmt::Formatter<'_>) -> core::fmt::Result {
        formatter.write_str(match self {
            Self::Full => "all row places are taken",
            Self::UnknownOutOfRange => "a term names an unknown that does not exist",
        })
    }
}

impl core::error::Error for RowRejected {}

/// Room for `ROWS` rows over `COLUMNS` unknowns, in single precision unless `F` says otherwise.
///
/// Takes about `4 * (ROWS * COLUMNS + 5 * ROWS + 7 * COLUMNS)` bytes in `f32`, needs no heap and never
/// panics. A pivot costs `rows * unknowns` multiplications.
///
/// ```
/// use balk_core::certificate::{Combination, Range, Row, Term};
/// use balk_core::simplex::{Outcome, Simplex};
///
/// // x + y >= 5 with x and y in [0, 2].
/// let boxes = [Range::between(0, 2); 2];
/// let terms = [Term { unknown: 0, coefficient: 1 }, Term { unknown: 1, coefficient: 1 }];
/// let row = Row { terms: &terms, range: Range::at_least(5) };
///
/// let mut simplex = Simplex::<4, 4>::new();
/// simplex.start(boxes).unwrap();
/// simplex.add_row(row).unwrap();
/// assert_eq!(simplex.solve(10), Outcome::Infeasible);
///
/// let mut multipliers = [0; 1];
/// simplex.multipliers(&mut multipliers);
/// let proof = Combination::new(&mut [0; 2])
///     .add(multipliers[0], row)
///     .and_then(|sum| sum.refute(boxes));
/// assert!(proof.is_ok());
/// ```
#[derive(Clone, Debug)]
pub struct Simplex<const ROWS: usize, const COLUMNS: usize, F: Real = f32> {
    entries: [[F; COLUMNS]; ROWS],
    basic: [Variable<F>; ROWS],
    nonbasic: [Variable<F>; COLUMNS],
    work: [F; COLUMNS],
    row_scales: [F; ROWS],
    unknown_scales: [F; COLUMNS],
    places: [u16; COLUMNS],
    rows: usize,
    unknowns: usize,
    conflict: Option<Conflict>,
    pivots: u32,
}

/// The basic variable that cannot be repaired.
#[derive(Clone, Copy, Debug)]
struct Conflict {
    row: usize,
    below: bool,
}

/// More unknowns were given than there are columns; the number of columns there are.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct TooManyUnknowns(pub usize);

impl core::fmt::Display for TooManyUnknowns {
    fn fmt(&self, formatter: &mut core::fmt::Formatter<'_>) -> core::fmt::Result {
        write!(formatter, "more than {} unknowns", self.0)
    }
}

impl core::error::Error for TooManyUnknowns {}

impl<const ROWS: usize, const COLUMNS: usize, F: Real> Default for Simplex<ROWS, COLUMNS, F> {
    fn default() -> Self {
        Self::new()
    }
}

impl<const ROWS: usize, const COLUMNS: usize, F: Real> Simplex<ROWS, COLUMNS, F> {
    /// No unknowns and no rows.
    pub const fn new() -> Self {
        const {
            assert!(
                ROWS > 0 && COLUMNS > 0,
                "a simplex needs at least one row and one column"
            );
            assert!(
                ROWS + COLUMNS <= u16::MAX as usize,
                "rows and columns are numbered in 16 bits"
            );
        }
        Self {
            entries: [[F::ZERO; COLUMNS]; ROWS],
            basic: [Variable::NONE; ROWS],
            nonbasic: [Variable::NONE; COLUMNS],
            work: [F::ZERO; COLUMNS],
            row_scales: [F::ONE; ROWS],
            unknown_scales: [F::ONE; COLUMNS],
            places: [0; COLUMNS],
            rows: 0,
            unknowns: 0,
            conflict: None,
            pivots: 0,
        }
    }

    /// Forgets everything and takes one unknown per box. Each starts at the value of its box nearest 0.
    ///
    /// # Errors
    /// With more boxes than columns, those that fit have been taken.
    pub fn start(&mut self, boxes: impl IntoIterator<Item = Range>) -> Result<(), TooManyUnknowns> {
        self.rows = 0;
        self.unknowns = 0;
        self.conflict = None;
        self.pivots = 0;
        let columns = self
            .nonbasic
            .iter_mut()
            .zip(&mut self.unknown_scales)
            .zip(&mut self.places);
        let mut columns = (0u16..).zip(columns);
        for range in boxes {
            let Some((id, ((variable, scale), place))) = columns.next() else {
                return Err(TooManyUnknowns(COLUMNS));
            };
            *scale = size(range);
            *place = id;
            *variable = Variable::new(id, range, F::ONE / *scale);
            self.unknowns += 1;
        }
        Ok(())
    }

    /// Replaces the box of an unknown and keeps the tableau. False if there is no such unknown.
    pub fn set_box(&mut self, unknown: usize, range: Range) -> bool {
        self.conflict = None;
        let mut tableau = self.tableau();
        let Some(scale) = tableau.unknown_scales.get(unknown).copied() else {
            return false;
        };
        tableau.set_range(unknown, range, F::ONE / scale);
        true
    }

    /// Adds a row, expressed over the present nonbasic variables. Its number is the count of rows before.
    ///
    /// Costs up to `terms * unknowns` multiplications.
    ///
    /// # Errors
    /// The row does not fit or names an unknown that does not exist.
    pub fn add_row(&mut self, row: Row<'_>) -> Result<(), RowRejected> {
        self.conflict = None;
        if self.rows == ROWS {
            return Err(RowRejected::Full);
        }
        if row
            .terms
            .iter()
            .any(|term| usize::from(term.unknown) >= self.unknowns)
        {
            return Err(RowRejected::UnknownOutOfRange);
        }
        self.rows += 1;
        self.tableau().fill_last_row(row);
        Ok(())
    }

    /// Looks for a point that meets every row and box, with at most `budget` pivots.
    ///
    /// The same input gives the same answer on machines with the same floating-point arithmetic.
    pub fn solve(&mut self, budget: u32) -> Outcome {
        let (outcome, conflict, pivots) = self.tableau().solve(budget);
        self.conflict = conflict;
        self.pivots = self.pivots.saturating_add(pivots);
        outcome
    }

    /// How many rows have been added.
    pub const fn rows(&self) -> usize {
        self.rows
    }

    /// Pivots made since [`start`](Self::start).
    pub const fn pivots(&self) -> u32 {
        self.pivots
    }

    /// Present value of an unknown in its own units, if there is such an unknown.
    pub fn value(&self, unknown: usize) -> Option<F> {
        let place = usize::from(*self.places.get(..self.unknowns)?.get(unknown)?);
        let variable = match place.checked_sub(self.unknowns) {
            None => self.nonbasic.get(place)?,
            Some(row) => self.basic.get(row)?,
        };
        Some(variable.value * *self.unknown_scales.get(unknown)?)
    }

    /// After [`Outcome::Infeasible`], the Farkas multiplier of each row as a float, in the sign convention
    /// of [`Combination::add`](crate::certificate::Combination::add) and up to a common positive factor.
    /// Otherwise empty. Rows left out have multiplier 0; no row occurs twice.
    pub fn conflict(&self) -> impl Iterator<Item = (usize, F)> + Clone {
        let (row, below) = match self.conflict {
            Some(conflict) => (conflict.row, conflict.below),
            None => (ROWS, false),
        };
        let unknowns = self.unknowns;
        let sign = if below { F::ONE } else { -F::ONE };
        let own = self.basic.get(row).map(|variable| (variable.id, -sign));
        let others = self
            .entries
            .get(row)
            .into_iter()
            .flatten()
            .zip(&self.nonbasic)
            .take(unknowns);
        others
            .map(move |(&entry, variable)| (variable, sign * entry))
            // What has an open side on the way is rounding noise, or there would be no conflict.
            .filter(|&(variable, slope)| variable.bound(slope > F::ZERO).magnitude() < F::INFINITY)
            .map(|(variable, slope)| (variable.id, slope))
            .chain(own)
            .filter_map(move |(id, multiplier)| {
                let row = usize::from(id).checked_sub(unknowns)?;
                Some((row, multiplier * *self.row_scales.get(row)?))
            })
    }

    /// After [`Outcome::Infeasible`], rounds the Farkas multipliers to integers, one per row; otherwise
    /// all become 0.
    ///
    /// They are scaled by the power of two that brings the sum of their sizes between 2^29 and 2^30, so no
    /// left-over of the kernel can overflow, whatever the coefficients (2^30 * 2^31 is below 2^63).
    /// Multipliers below 2^-31 of that sum round to 0, so rows should be stated with coefficients of
    /// similar size. Entries of `multipliers` beyond the rows are set to 0.
    pub fn multipliers(&self, multipliers: &mut [i32]) {
        multipliers.fill(0);
        let sum = self
            .conflict()
            .fold(F::ZERO, |sum, (_, multiplier)| sum + multiplier.magnitude());
        let scale = F::from_i64(1 << 29) / sum.power_of_two();
        for (row, multiplier) in self.conflict() {
            if let Some(place) = multipliers.get_mut(row) {
                *place = (multiplier * scale).to_i32();
            }
        }
    }

    fn tableau(&mut self) -> Tableau<'_, F> {
        Tableau {
            entries: self.entries.as_flattened_mut(),
            stride: COLUMNS,
            basic: self.basic.get_mut(..self.rows).unwrap_or_default(),
            nonbasic: self.nonbasic.get_mut(..self.unknowns).unwrap_or_default(),
            work: self.work.get_mut(..self.unknowns).unwrap_or_default(),
            row_scales: self.row_scales.get_mut(..self.rows).unwrap_or_default(),
            unknown_scales: self.unknown_scales.get(..self.unknowns).unwrap_or_default(),
            places: self.places.get_mut(..self.unknowns).unwrap_or_default(),
        }
    }
}

/// Power of two of the size of a range: of its end furthest from 0, or 1 if it has an open side.
fn size<F: Real>(range: Range) -> F {
    match (range.lower, range.upper) {
        (Some(lower), Some(upper)) => F::from_i64(lower)
            .magnitude()
            .larger(F::from_i64(upper).magnitude())
            .larger(F::ONE)
            .power_of_two(),
        _ => F::ONE,
    }
}
