//! Linear forms over the lifted unknowns, and the rows made of them.

use balk_core::certificate::{Range, Row, Term};
use balk_core::fixed::{FRACTION_BITS, Interval, ONE};

/// Sides of a row beyond this say nothing.
const FARTHEST: i128 = 1 << 62;

/// A quantity as a sum of coefficients (30 fraction bits) times unknowns (at most one in size),
/// plus a rest between two bounds (60 fraction bits).
#[derive(Clone, Debug, Default)]
pub struct Form {
    terms: Vec<(u16, i64)>,
    lo: i128,
    hi: i128,
}

impl Form {
    /// One unknown.
    pub fn unknown(unknown: usize) -> Form {
        let mut form = Form::default();
        form.term(unknown as u16, ONE as i64);
        form
    }

    /// Adds a coefficient.
    fn term(&mut self, unknown: u16, coefficient: i64) {
        if let Some(own) = self.terms.iter_mut().find(|t| t.0 == unknown) {
            own.1 += coefficient;
        } else {
            self.terms.push((unknown, coefficient));
        }
    }

    /// Adds something known to lie between two bounds, 60 fraction bits.
    pub fn rest(&mut self, lo: i64, hi: i64) {
        self.lo += lo as i128;
        self.hi += hi as i128;
    }

    /// Adds `factor` (30 fraction bits, at most four in size) times another form.
    pub fn add(&mut self, other: &Form, factor: i64) {
        let half = 1i128 << (FRACTION_BITS - 1);
        for &(unknown, coefficient) in &other.terms {
            let exact = coefficient as i128 * factor as i128;
            let scaled = (exact + half) >> FRACTION_BITS;
            if scaled << FRACTION_BITS != exact {
                // Half a unit at most, times an unknown of at most one.
                self.lo -= half;
                self.hi += half;
            }
            self.term(unknown, scaled as i64);
        }
        let (a, b) = (other.lo * factor as i128, other.hi * factor as i128);
        self.lo += a.min(b) >> FRACTION_BITS;
        self.hi += -((-a.max(b)) >> FRACTION_BITS);
    }

    /// Adds a constant factor that is only known to lie in an interval, times a form whose value
    /// is at most one in size.
    pub fn add_between(&mut self, other: &Form, factor: Interval) {
        let middle = (factor.lo as i64 + factor.hi as i64) >> 1;
        self.add(other, middle);
        let spread = ((factor.width() + 1) >> 1) << FRACTION_BITS;
        self.rest(-spread, spread);
    }

    /// Value where the unknowns have these values (30 fraction bits) and the rest is half way.
    pub fn at(&self, point: &[i32]) -> i64 {
        let sum: i128 = self
            .terms
            .iter()
            .map(|&(unknown, c)| {
                c as i128 * point.get(unknown as usize).copied().unwrap_or(0) as i128
            })
            .sum();
        (sum + ((self.lo + self.hi) >> 1)) as i64
    }

    /// The row that says the quantity is at least and at most something (60 fraction bits).
    ///
    /// Its largest coefficient is brought to between one half and one.
    pub fn between(&self, least: Option<i64>, most: Option<i64>) -> Option<LiftedRow> {
        let largest = self.terms.iter().map(|t| t.1.unsigned_abs()).max()?;
        if largest == 0 {
            return None;
        }
        let bits = 64 - largest.leading_zeros() as i32;
        let up = (FRACTION_BITS as i32 - bits).clamp(-30, 16);
        let mut error = 0;
        let mut terms = Vec::new();
        for &(unknown, coefficient) in &self.terms {
            let coefficient = if up >= 0 {
                coefficient << up
            } else {
                error += 1i128 << (FRACTION_BITS - 1);
                (coefficient + (1 << (-up - 1))) >> -up
            };
            if coefficient != 0 {
                let coefficient = i32::try_from(coefficient).ok()?;
                terms.push(Term {
                    unknown,
                    coefficient,
                });
            }
        }
        let down = |value: i128| if up >= 0 { value << up } else { value >> -up };
        let lower = least
            .map(|l| down(l as i128 - self.hi) - error)
            .filter(|l| *l > -FARTHEST)
            .map(|l| l.min(FARTHEST) as i64);
        let upper = most
            .map(|m| -down(self.lo - m as i128) + error)
            .filter(|u| *u < FARTHEST)
            .map(|u| u.max(-FARTHEST) as i64);
        (lower.is_some() || upper.is_some()).then_some(LiftedRow {
            terms,
            range: Range { lower, upper },
        })
    }
}

/// A row with its own terms: coefficients with 30 fraction bits, the range with 60.
#[derive(Clone, Debug)]
pub struct LiftedRow {
    terms: Vec<Term>,
    range: Range,
}

impl LiftedRow {
    /// As the kernel and the simplex read it.
    pub fn row(&self) -> Row<'_> {
        Row {
            terms: &self.terms,
            range: self.range,
        }
    }

    /// How far a point (30 fraction bits) misses the row, 30 fraction bits; negative inside.
    pub fn violation(&self, point: &[i32]) -> i64 {
        let sum: i128 = self
            .terms
            .iter()
            .map(|t| {
                t.coefficient as i64 * point.get(t.unknown as usize).copied().unwrap_or(0) as i64
            })
            .map(i128::from)
            .sum();
        let below = self.range.lower.map_or(i128::MIN, |l| l as i128 - sum);
        let above = self.range.upper.map_or(i128::MIN, |u| sum - u as i128);
        (below.max(above) >> FRACTION_BITS) as i64
    }
}
