//! The core's simplex beside a general-purpose solver on the same random systems.

use std::collections::BTreeMap;
use std::time::{Duration, Instant};

use balk_core::certificate::{Combination, Range, Refuted, Row, Term, Unproved};
use balk_core::simplex::{Outcome, Real, Simplex};
use microlp::{ComparisonOp, OptimizationDirection, Problem};
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;

/// Rows and boxes over integers, as the core takes them.
#[derive(Clone, Debug, Default)]
pub struct System {
    /// One box per unknown.
    pub boxes: Vec<Range>,
    /// The rows.
    pub rows: Vec<OwnedRow>,
}

/// A [`Row`] that owns its terms.
#[derive(Clone, Debug)]
pub struct OwnedRow {
    /// The linear form.
    pub terms: Vec<Term>,
    /// Where its value must lie.
    pub range: Range,
}

impl OwnedRow {
    /// From pairs of unknown and coefficient.
    pub fn new(terms: impl IntoIterator<Item = (usize, i32)>, range: Range) -> Self {
        let term = |(unknown, coefficient)| Term {
            unknown: u16::try_from(unknown).unwrap(),
            coefficient,
        };
        Self {
            terms: terms.into_iter().map(term).collect(),
            range,
        }
    }

    /// The same row, borrowed.
    pub fn as_row(&self) -> Row<'_> {
        Row {
            terms: &self.terms,
            range: self.range,
        }
    }
}

impl System {
    /// Asks the kernel whether these multipliers prove the system empty.
    pub fn prove(&self, multipliers: &[i32]) -> Result<Refuted, Unproved> {
        let mut left_overs = vec![0; self.boxes.len()];
        let rows = self.rows.iter().map(OwnedRow::as_row);
        multipliers
            .iter()
            .zip(rows)
            .try_fold(
                Combination::new(&mut left_overs),
                |sum, (&multiplier, row)| sum.add(multiplier, row),
            )?
            .refute(self.boxes.iter().copied())
    }

    /// Gives the system to a simplex.
    ///
    /// # Panics
    /// If it does not fit.
    pub fn load<const ROWS: usize, const COLUMNS: usize, F: Real>(
        &self,
        simplex: &mut Simplex<ROWS, COLUMNS, F>,
    ) {
        simplex
            .start(self.boxes.iter().copied())
            .expect("too many unknowns");
        for row in &self.rows {
            simplex.add_row(row.as_row()).expect("too many rows");
        }
    }

    /// The general-purpose solver's opinion: whether the system has a solution, `None` if it cannot say.
    pub fn second_opinion(&self) -> Option<bool> {
        let side = |side: Option<i64>, open: f64| side.map_or(open, |side| side as f64);
        let mut problem = Problem::new(OptimizationDirection::Minimize);
        let unknowns: Vec<_> = self
            .boxes
            .iter()
            .map(|range| {
                problem.add_var(
                    0.0,
                    (
                        side(range.lower, f64::NEG_INFINITY),
                        side(range.upper, f64::INFINITY),
                    ),
                )
            })
            .collect();
        for row in &self.rows {
            let mut sums = BTreeMap::new();
            for term in &row.terms {
                *sums.entry(term.unknown).or_insert(0.0) += f64::from(term.coefficient);
            }
            let terms: Vec<_> = sums
                .iter()
                .map(|(&unknown, &sum)| (unknowns[usize::from(unknown)], sum))
                .collect();
            if let Some(upper) = row.range.upper {
                problem.add_constraint(&terms, ComparisonOp::Le, upper as f64);
            }
            if let Some(lower) = row.range.lower {
                problem.add_constraint(&terms, ComparisonOp::Ge, lower as f64);
            }
        }
        match problem.solve() {
            Ok(_) => Some(true),
            Err(microlp::Error::Infeasible) => Some(false),
            Err(_) => None,
        }
    }
}

/// How a random system is made.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum Family {
    /// Rows are drawn around a hidden point of the boxes.
    Feasible,
    /// The last row contradicts a hidden combination of the others.
    Infeasible,
    /// Right sides are drawn without regard to either.
    Open,
}

impl Family {
    /// All families.
    pub const ALL: [Self; 3] = [Self::Feasible, Self::Infeasible, Self::Open];

    /// A system with this many unknowns and rows, and up to `density` unknowns in a row.
    pub fn draw(
        self,
        unknowns: usize,
        rows: usize,
        density: usize,
        random: &mut impl Rng,
    ) -> System {
        let boxes: Vec<Range> = (0..unknowns)
            .map(|_| {
                let (a, b) = (
                    random.random_range(-1_000_000..=1_000_000),
                    random.random_range(-1_000_000..=1_000_000),
                );
                Range::between(i64::min(a, b), i64::max(a, b))
            })
            .collect();
        let ends = |range: &Range| (range.lower.unwrap(), range.upper.unwrap());
        let point: Vec<i64> = boxes
            .iter()
            .map(|range| random.random_range(ends(range).0..=ends(range).1))
            .collect();
        let mut system = System {
            boxes,
            rows: Vec::new(),
        };
        for _ in 0..rows {
            let terms: Vec<(usize, i32)> = (0..density)
                .map(|_| {
                    (
                        random.random_range(0..unknowns),
                        random.random_range(-1000..=1000),
                    )
                })
                .collect();
            let at = |x: &dyn Fn(usize, i64) -> i64| -> i64 {
                terms
                    .iter()
                    .map(|&(unknown, coefficient)| x(unknown, i64::from(coefficient)))
                    .sum()
            };
            let value = at(&|unknown, coefficient| coefficient * point[unknown]);
            let spread = at(&|unknown, coefficient| {
                let (lower, upper) = ends(&system.boxes[unknown]);
                coefficient.abs() * (upper - lower)
            });
            let centre = match self {
                Self::Feasible | Self::Infeasible => value,
                Self::Open => {
                    let middle = at(&|unknown, coefficient| {
                        let (lower, upper) = ends(&system.boxes[unknown]);
                        coefficient * ((lower + upper) / 2)
                    });
                    middle + random.random_range(-spread / 6..=spread / 6)
                }
            };
            let slack = random.random_range(0..=spread / 20);
            let range = match random.random_range(0..3) {
                0 => Range::at_most(centre + slack),
                1 => Range::at_least(centre - slack),
                _ => Range::between(centre - slack, centre + slack),
            };
            system.rows.push(OwnedRow::new(terms, range));
        }
        if self == Self::Infeasible {
            system.contradict(random);
        }
        system
    }
}

impl System {
    /// Replaces the last row by one that contradicts a combination of four others, by one part in 10,000
    /// of the size of the right sides.
    fn contradict(&mut self, random: &mut impl Rng) {
        self.rows.pop();
        let mut terms = Vec::new();
        let (mut right_side, mut size) = (0, 0);
        for _ in 0..4 {
            let row = &self.rows[random.random_range(0..self.rows.len())];
            let (multiplier, side) = match row.range {
                Range {
                    upper: Some(upper), ..
                } => (random.random_range(1..=9), upper),
                Range { lower, .. } => (-random.random_range(1..=9), lower.unwrap()),
            };
            right_side += i64::from(multiplier) * side;
            size += i64::from(multiplier).abs() * side.abs();
            terms.extend(
                row.terms
                    .iter()
                    .map(|term| (usize::from(term.unknown), multiplier * term.coefficient)),
            );
        }
        self.rows.push(OwnedRow::new(
            terms,
            Range::at_least(right_side + 1 + size / 10_000),
        ));
    }
}

/// Counts of one family in one size.
#[derive(Clone, Copy, Debug, Default)]
pub struct Tally {
    /// Systems drawn.
    pub systems: u32,
    /// Proved empty by the kernel.
    pub proved: u32,
    /// Called infeasible, but the kernel did not accept the multipliers.
    pub unproved: u32,
    /// Called feasible.
    pub feasible: u32,
    /// Out of pivots or unstable.
    pub given_up: u32,
    /// Proved empty, though the second opinion has a solution; or called feasible, though it has none.
    pub contradictions: u32,
    /// The second opinion gave none.
    pub no_second_opinion: u32,
    /// Systems the second opinion calls empty that were not proved empty.
    pub missed: u32,
    /// Pivots of all systems together.
    pub pivots: u32,
    /// Most pivots of one system.
    pub most_pivots: u32,
    /// Time of the simplex with the kernel.
    pub seconds: f64,
    /// Time of the second opinion.
    pub second_opinion_seconds: f64,
}

/// Room for the largest systems measured.
type Measured = Simplex<40, 80, f32>;

/// Decides `systems` random systems with both programs. Times include stating the problem and, for the
/// simplex, the kernel; drawing is left out.
pub fn tally(
    family: Family,
    unknowns: usize,
    rows: usize,
    density: usize,
    systems: u32,
    seed: u64,
) -> Tally {
    let mut random = ChaCha8Rng::seed_from_u64(seed);
    let mut simplex = Box::new(Measured::new());
    let mut tally = Tally {
        systems,
        ..Tally::default()
    };
    let (mut time, mut other_time) = (Duration::ZERO, Duration::ZERO);
    for _ in 0..systems {
        let system = family.draw(unknowns, rows, density, &mut random);
        let start = Instant::now();
        system.load(&mut simplex);
        let outcome = simplex.solve(2000);
        let mut multipliers = [0; 40];
        let proved = outcome == Outcome::Infeasible && {
            simplex.multipliers(&mut multipliers);
            system.prove(&multipliers).is_ok()
        };
        time += start.elapsed();
        let start = Instant::now();
        let opinion = system.second_opinion();
        other_time += start.elapsed();

        let feasible = outcome == Outcome::Feasible;
        tally.proved += u32::from(proved);
        tally.unproved += u32::from(outcome == Outcome::Infeasible && !proved);
        tally.feasible += u32::from(feasible);
        tally.given_up += u32::from(matches!(outcome, Outcome::OutOfPivots | Outcome::Unstable));
        tally.contradictions +=
            u32::from(proved && opinion == Some(true) || feasible && opinion == Some(false));
        tally.no_second_opinion += u32::from(opinion.is_none());
        tally.missed += u32::from(!proved && opinion == Some(false));
        tally.pivots += simplex.pivots();
        tally.most_pivots = tally.most_pivots.max(simplex.pivots());
    }
    tally.seconds = time.as_secs_f64();
    tally.second_opinion_seconds = other_time.as_secs_f64();
    tally
}

/// Prints a table over families and sizes.
pub fn run(systems: u32, seed: u64) {
    println!(
        "| family | unknowns | rows | in a row | systems | proved | unproved | feasible | given up | contradictions \
         | missed | no opinion | pivots mean | most | us each | us microlp | ratio |"
    );
    println!("|{}", "---|".repeat(17));
    for family in Family::ALL {
        for (unknowns, rows, density) in [
            (30, 8, 4),
            (30, 20, 6),
            (50, 30, 8),
            (80, 40, 5),
            (80, 40, 20),
        ] {
            let tally = tally(family, unknowns, rows, density, systems, seed);
            let each = |total: f64| total / f64::from(systems);
            println!(
                "| {family:?} | {unknowns} | {rows} | {density} | {} | {} | {} | {} | {} | {} | {} | {} | {:.1} | {} | {:.1} | {:.1} | {:.1} |",
                tally.systems,
                tally.proved,
                tally.unproved,
                tally.feasible,
                tally.given_up,
                tally.contradictions,
                tally.missed,
                tally.no_second_opinion,
                each(f64::from(tally.pivots)),
                tally.most_pivots,
                each(1e6 * tally.seconds),
                each(1e6 * tally.second_opinion_seconds),
                tally.second_opinion_seconds / tally.seconds,
            );
        }
    }
}
