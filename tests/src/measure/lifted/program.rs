//! Lifted rows: a second linear program over a propagated node, an experiment beside
//! `relaxation`.
//!
//! Unknowns are the cosine and sine of every joint and the components of every feature's view
//! after every joint (and in the base). The view *before* a joint is a linear form in the view
//! after the previous one, so links hold by substitution, to within the placement's slack. What is
//! not linear is enclosed: products by McCormick envelopes, squares by secants and tangents, arcs by
//! chords, rotations by cuts of their convex hull. Rows are made where the present point of the
//! simplex violates them, most violated first, into a fixed number of places; the integer kernel
//! has the last word.

use super::form::LiftedRow;
use super::relations::violated;
use super::unknowns::Lifted;
use balk_core::certificate::{Combination, Refuted};
use balk_core::fixed::ONE;
use balk_core::propagate::Network;
use balk_core::simplex::{Outcome, Real, Simplex};

/// Most rows taken up between two runs of the simplex.
pub const BATCH: usize = 8;
/// A row that is missed by less than this many units is not worth a place.
pub const LEAST: i64 = 1 << 12;

/// Which rows are made, and over which features.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Families(pub u32);

impl Families {
    /// Joint origins and axes beside the tip's origin and axes.
    pub const JOINTS: Families = Families(1);
    /// Equal third components across a turning joint, views before joints, turn limits.
    pub const LINEAR: Families = Families(2);
    /// Envelopes of the rotation of the plane by a joint, both ways.
    pub const ROTATION: Families = Families(4);
    /// Envelopes of dot and cross product before and after a joint.
    pub const DOT_CROSS: Families = Families(8);
    /// Tangents and secants of unit vectors, and of squared distances.
    pub const SQUARES: Families = Families(16);
    /// Chord of each arc and tangents of the circle.
    pub const ARCS: Families = Families(32);
    /// Envelopes of the closing relation at the target.
    pub const CLOSING: Families = Families(64);
    /// Envelopes of the orthogonality of the tip's axes.
    pub const ORTHOGONAL: Families = Families(128);
    /// Cuts of the convex hull of the rotations.
    pub const HULL: Families = Families(256);
    /// All of them.
    pub const ALL: Families = Families(511);

    /// Whether all of `other` are among these.
    pub fn has(self, other: Families) -> bool {
        self.0 & other.0 == other.0
    }

    /// These and others.
    pub const fn with(self, other: Families) -> Families {
        Families(self.0 | other.0)
    }
}

/// The most violated rows met so far.
#[derive(Debug, Default)]
pub struct Pool {
    rows: Vec<(i64, LiftedRow)>,
}

impl Pool {
    /// Takes a row if the point misses it by more than what is already here.
    pub fn offer(&mut self, row: Option<LiftedRow>, point: &[i32]) {
        let Some(row) = row else { return };
        let violation = row.violation(point);
        if violation < LEAST {
            return;
        }
        if self.rows.len() == BATCH {
            let Some(least) = (0..self.rows.len()).min_by_key(|&i| self.rows[i].0) else {
                return;
            };
            if self.rows[least].0 >= violation {
                return;
            }
            self.rows.swap_remove(least);
        }
        self.rows.push((violation, row));
    }

    /// The rows.
    pub fn rows(&self) -> impl Iterator<Item = &LiftedRow> {
        self.rows.iter().map(|r| &r.1)
    }
}

/// What a run of the lifted program came to.
#[derive(Debug)]
pub struct Attempt {
    /// Proof that the node is empty.
    pub refuted: Option<Refuted>,
    /// Rows taken up.
    pub rows: usize,
    /// Pivots made.
    pub pivots: u32,
    /// How it ended.
    pub end: End,
}

/// How a run of the lifted program ended.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum End {
    /// The kernel confirmed the multipliers.
    Refuted,
    /// The kernel did not confirm them.
    Unconfirmed,
    /// A point meets every row there is.
    Feasible,
    /// Rows or unknowns did not fit.
    Full,
    /// Pivots or precision ran out.
    Stopped,
}

/// Tries to show that a propagated node is empty, with at most `pivots` pivots.
///
/// `None` in [`Attempt::refuted`] means no proof, never that a posture exists.
pub fn refute<const ROWS: usize, const COLUMNS: usize, F: Real>(
    network: &Network,
    families: Families,
    simplex: &mut Simplex<ROWS, COLUMNS, F>,
    pivots: u32,
) -> Attempt {
    let lifted = Lifted::new(network, families, COLUMNS);
    let mut rows: Vec<LiftedRow> = Vec::new();
    let mut point = [0i32; COLUMNS];
    let end = propose(&lifted, simplex, &mut rows, &mut point, pivots);
    let refuted = match end {
        End::Refuted => confirm(&lifted, simplex, &rows),
        _ => None,
    };
    Attempt {
        rows: rows.len(),
        pivots: simplex.pivots(),
        end: if end == End::Refuted && refuted.is_none() {
            End::Unconfirmed
        } else {
            end
        },
        refuted,
    }
}

/// Adds rows and solves until the program has no solution or no row is missed.
fn propose<const ROWS: usize, const COLUMNS: usize, F: Real>(
    lifted: &Lifted,
    simplex: &mut Simplex<ROWS, COLUMNS, F>,
    rows: &mut Vec<LiftedRow>,
    point: &mut [i32; COLUMNS],
    pivots: u32,
) -> End {
    if simplex.start(lifted.boxes()).is_err() {
        return End::Full;
    }
    loop {
        for (unknown, own) in point.iter_mut().enumerate().take(lifted.unknowns()) {
            let value = simplex.value(unknown).map_or(0, Real::to_i32);
            *own = value.clamp(-ONE, ONE);
        }
        let pool = violated(lifted, point, lifted.families());
        if pool.rows().next().is_none() {
            return End::Feasible;
        }
        for row in pool.rows() {
            if simplex.add_row(row.row()).is_err() {
                return End::Full;
            }
            rows.push(row.clone());
        }
        match simplex.solve(pivots.saturating_sub(simplex.pivots())) {
            Outcome::Feasible => {}
            Outcome::Infeasible => return End::Refuted,
            _ => return End::Stopped,
        }
    }
}

/// Puts the simplex's multipliers to the kernel.
fn confirm<const ROWS: usize, const COLUMNS: usize, F: Real>(
    lifted: &Lifted,
    simplex: &Simplex<ROWS, COLUMNS, F>,
    rows: &[LiftedRow],
) -> Option<Refuted> {
    let mut multipliers = [0i32; ROWS];
    simplex.multipliers(&mut multipliers);
    let mut left_overs = [0i64; COLUMNS];
    let mut sum = Combination::new(left_overs.get_mut(..lifted.unknowns())?);
    for (row, &multiplier) in rows.iter().zip(&multipliers) {
        sum = sum.add(multiplier, row.row()).ok()?;
    }
    sum.refute(lifted.boxes()).ok()
}
