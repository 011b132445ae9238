//! The tableau and its pivots, over slices so that each precision is compiled once.

use super::{Conflict, Outcome, Real};
use crate::certificate::{Range, Row};

/// An unknown or the value of a row, in scaled units.
#[derive(Clone, Copy, Debug)]
pub(super) struct Variable<F> {
    /// Unknowns come first, rows after them.
    pub(super) id: u16,
    pub(super) value: F,
    lower: F,
    upper: F,
}

impl<F: Real> Variable<F> {
    pub(super) const NONE: Self = Self {
        id: 0,
        value: F::ZERO,
        lower: F::ZERO,
        upper: F::ZERO,
    };

    /// At the value of `range` nearest 0.
    pub(super) fn new(id: u16, range: Range, scale: F) -> Self {
        let mut variable = Self { id, ..Self::NONE };
        variable.set_range(range, scale);
        variable.value = F::ZERO.larger(variable.lower).smaller(variable.upper);
        variable
    }

    fn set_range(&mut self, range: Range, scale: F) {
        self.lower = range
            .lower
            .map_or(-F::INFINITY, |end| F::from_i64(end) * scale);
        self.upper = range
            .upper
            .map_or(F::INFINITY, |end| F::from_i64(end) * scale);
    }

    /// How far outside its bounds, beyond tolerance, and whether below; `None` if inside.
    fn violation(&self) -> Option<(F, bool)> {
        let (below, above) = (self.lower - self.value, self.value - self.upper);
        if below > tolerance(self.lower) {
            Some((below, true))
        } else if above > tolerance(self.upper) {
            Some((above, false))
        } else {
            None
        }
    }

    /// The bound met by moving up or down.
    pub(super) fn bound(&self, up: bool) -> F {
        if up { self.upper } else { self.lower }
    }
}

/// How far beyond `end` still counts as met.
fn tolerance<F: Real>(end: F) -> F {
    F::TOLERANCE * (F::ONE + end.magnitude())
}

/// `basic = entries * nonbasic`, cut to the rows and unknowns in use.
pub(super) struct Tableau<'a, F> {
    pub(super) entries: &'a mut [F],
    pub(super) stride: usize,
    pub(super) basic: &'a mut [Variable<F>],
    pub(super) nonbasic: &'a mut [Variable<F>],
    pub(super) work: &'a mut [F],
    pub(super) row_scales: &'a mut [F],
    pub(super) unknown_scales: &'a [F],
    /// Where each unknown is: a column, or after the columns a row.
    pub(super) places: &'a mut [u16],
}

impl<F: Real> Tableau<'_, F> {
    /// Repairs violated rows until there are none, one cannot be repaired, or the budget is spent.
    pub(super) fn solve(&mut self, budget: u32) -> (Outcome, Option<Conflict>, u32) {
        // Far above the usual number of pivots, which is about that of the rows.
        let patience = 4 * (self.basic.len() + self.nonbasic.len()) as u32;
        let mut pivots = 0;
        self.refresh();
        let mut fresh = true;
        loop {
            let least_index = pivots >= patience;
            let Some(conflict) = self.violated(least_index) else {
                if fresh {
                    let finite = self
                        .basic
                        .iter()
                        .all(|variable| variable.value.magnitude() < F::INFINITY);
                    return (
                        if finite {
                            Outcome::Feasible
                        } else {
                            Outcome::Unstable
                        },
                        None,
                        pivots,
                    );
                }
                self.refresh();
                fresh = true;
                continue;
            };
            let Some(column) = self.entering(conflict, least_index) else {
                return (Outcome::Infeasible, Some(conflict), pivots);
            };
            if pivots == budget {
                return (Outcome::OutOfPivots, None, pivots);
            }
            self.repair(conflict, column);
            pivots += 1;
            fresh = false;
        }
    }

    /// The most violated basic variable, or the one of least index (Bland, *New finite pivoting rules for
    /// the simplex method*, Math. Oper. Res. 2, 1977, 103-107).
    fn violated(&self, least_index: bool) -> Option<Conflict> {
        let mut chosen: Option<(F, u16, Conflict)> = None;
        for (row, variable) in self.basic.iter().enumerate() {
            let Some((violation, below)) = variable.violation() else {
                continue;
            };
            let better = chosen.as_ref().is_none_or(|&(greatest, least, _)| {
                if least_index {
                    variable.id < least
                } else {
                    violation > greatest
                }
            });
            if better {
                chosen = Some((violation, variable.id, Conflict { row, below }));
            }
        }
        chosen.map(|(_, _, conflict)| conflict)
    }

    /// The nonbasic variable to exchange the violated one with, or `None` if all of them together, moved to
    /// their bounds, leave it outside its own.
    ///
    /// Preferred is the one that can close most of the gap, times the size of its entry: small pivots
    /// amplify rounding. With `least_index`, it is the one of least index that can move at all.
    fn entering(&self, conflict: Conflict, least_index: bool) -> Option<usize> {
        let variable = self.basic.get(conflict.row)?;
        let sign = if conflict.below { F::ONE } else { -F::ONE };
        let end = sign * variable.bound(!conflict.below);
        let gap = end - sign * variable.value;
        let mut furthest = F::ZERO;
        let mut chosen: Option<(F, u16, usize)> = None;
        for (column, (&entry, other)) in self
            .row(conflict.row)
            .iter()
            .zip(self.nonbasic.iter())
            .enumerate()
        {
            let slope = sign * entry;
            let (size, up) = (slope.magnitude(), slope > F::ZERO);
            let bound = other.bound(up);
            let noise = size <= F::NEGLIGIBLE;
            if noise && bound.magnitude() == F::INFINITY {
                continue;
            }
            furthest = furthest + slope * bound;
            let room = (bound - other.value).magnitude();
            if noise || room == F::ZERO {
                continue;
            }
            let score = gap.smaller(size * room) * size;
            let better = chosen.is_none_or(|(best, least, _)| {
                if least_index {
                    other.id < least
                } else {
                    score > best
                }
            });
            if better {
                chosen = Some((score, other.id, column));
            }
        }
        if end - furthest > tolerance(end) {
            None
        } else {
            chosen.map(|(_, _, column)| column)
        }
    }

    /// Moves a violated basic variable to its nearest bound and exchanges it with a nonbasic one.
    fn repair(&mut self, conflict: Conflict, column: usize) {
        let Some(leaving) = self.basic.get_mut(conflict.row) else {
            return;
        };
        let Some(entering) = self.nonbasic.get_mut(column) else {
            return;
        };
        let pivot_row = row_mut(self.entries, self.stride, conflict.row, self.work.len());
        let Some(&pivot) = pivot_row.get(column) else {
            return;
        };

        let end = if conflict.below {
            leaving.lower
        } else {
            leaving.upper
        };
        let step = (end - leaving.value) / pivot;
        leaving.value = end;
        entering.value = entering.value + step;
        core::mem::swap(leaving, entering);

        // leaving = sum_j entry_j x_j, solved for the entering variable.
        let inverse = F::ONE / pivot;
        for (work, &entry) in self.work.iter_mut().zip(pivot_row.iter()) {
            *work = -entry * inverse;
        }
        if let Some(work) = self.work.get_mut(column) {
            *work = inverse;
        }
        copy(self.work, pivot_row);

        let rows = self
            .entries
            .chunks_exact_mut(self.stride)
            .zip(self.basic.iter_mut());
        for (row, (entries, variable)) in rows.enumerate() {
            let Some(slot) = entries.get_mut(column) else {
                return;
            };
            let factor = *slot;
            if row == conflict.row || factor == F::ZERO {
                continue;
            }
            *slot = F::ZERO;
            variable.value = variable.value + factor * step;
            for (entry, &work) in entries.iter_mut().zip(self.work.iter()) {
                *entry = *entry + factor * work;
            }
        }
        self.note_place(column);
        self.note_place(self.nonbasic.len() + conflict.row);
    }

    /// Recomputes every basic value from the nonbasic ones.
    fn refresh(&mut self) {
        for (entries, variable) in self
            .entries
            .chunks_exact(self.stride)
            .zip(self.basic.iter_mut())
        {
            variable.value = value_of(entries, self.nonbasic);
        }
    }

    /// Writes `row` into the last row in use, which becomes basic.
    pub(super) fn fill_last_row(&mut self, row: Row<'_>) {
        let Some(last) = self.basic.len().checked_sub(1) else {
            return;
        };
        let largest = row.terms.iter().fold(F::ZERO, |largest, term| {
            let scale = self
                .unknown_scales
                .get(usize::from(term.unknown))
                .copied()
                .unwrap_or(F::ZERO);
            largest.larger(F::from_i64(term.coefficient.into()).magnitude() * scale)
        });
        let scale = if largest > F::ZERO {
            F::ONE / largest.power_of_two()
        } else {
            F::ONE
        };
        let columns = self.nonbasic.len();
        self.work.fill(F::ZERO);
        for term in row.terms {
            let unknown = usize::from(term.unknown);
            let (Some(&unknown_scale), Some(&place)) =
                (self.unknown_scales.get(unknown), self.places.get(unknown))
            else {
                continue;
            };
            let factor = F::from_i64(term.coefficient.into()) * unknown_scale * scale;
            let place = usize::from(place);
            match place.checked_sub(columns) {
                None => {
                    if let Some(work) = self.work.get_mut(place) {
                        *work = *work + factor;
                    }
                }
                Some(basic) => {
                    let entries = row_mut(self.entries, self.stride, basic, columns);
                    for (work, &entry) in self.work.iter_mut().zip(entries.iter()) {
                        *work = *work + factor * entry;
                    }
                }
            }
        }
        copy(self.work, row_mut(self.entries, self.stride, last, columns));
        if let Some(slot) = self.row_scales.get_mut(last) {
            *slot = scale;
        }
        let mut variable = Variable::new((columns + last) as u16, row.range, scale);
        variable.value = value_of(self.work, self.nonbasic);
        if let Some(slot) = self.basic.get_mut(last) {
            *slot = variable;
        }
    }

    /// Sets the range of an unknown; one that is nonbasic moves to the nearest allowed value.
    pub(super) fn set_range(&mut self, unknown: usize, range: Range, scale: F) {
        let Some(&place) = self.places.get(unknown) else {
            return;
        };
        let place = usize::from(place);
        match place.checked_sub(self.nonbasic.len()) {
            None => {
                if let Some(variable) = self.nonbasic.get_mut(place) {
                    variable.set_range(range, scale);
                    variable.value = variable
                        .value
                        .larger(variable.lower)
                        .smaller(variable.upper);
                }
            }
            Some(row) => {
                if let Some(variable) = self.basic.get_mut(row) {
                    variable.set_range(range, scale);
                }
            }
        }
    }

    fn row(&self, row: usize) -> &[F] {
        let start = row * self.stride;
        self.entries
            .get(start..start + self.nonbasic.len())
            .unwrap_or_default()
    }

    /// Records where the variable at `place` is, if it is an unknown.
    fn note_place(&mut self, place: usize) {
        let variable = match place.checked_sub(self.nonbasic.len()) {
            None => self.nonbasic.get(place),
            Some(row) => self.basic.get(row),
        };
        if let Some(slot) =
            variable.and_then(|variable| self.places.get_mut(usize::from(variable.id)))
        {
            *slot = place as u16;
        }
    }
}

fn row_mut<F>(entries: &mut [F], stride: usize, row: usize, length: usize) -> &mut [F] {
    let start = row * stride;
    entries.get_mut(start..start + length).unwrap_or_default()
}

fn value_of<F: Real>(entries: &[F], nonbasic: &[Variable<F>]) -> F {
    entries
        .iter()
        .zip(nonbasic)
        .fold(F::ZERO, |sum, (&entry, variable)| {
            sum + entry * variable.value
        })
}

fn copy<F: Copy>(from: &[F], to: &mut [F]) {
    for (to, &from) in to.iter_mut().zip(from) {
        *to = from;
    }
}
