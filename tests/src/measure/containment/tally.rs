//! What containment checks count.

use balk_core::fixed::{Interval, ONE};

/// Units of the fixed point in one.
pub const UNITS: f64 = ONE as f64;
/// How far a truth may lie outside its box, units: what double precision leaves open (about 1e-12
/// of the reach), a thousandth of what any rounding of the core amounts to.
const ALLOWANCE: f64 = 1e-3;

/// What is compared with the truth.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kinds {
    /// Features in the base frame.
    Base,
    /// Features seen from joints before motion.
    Before,
    /// Features seen from joints after motion.
    After,
    /// Features in the tip frame.
    Tip,
    /// Squared lengths of all of these.
    Square,
    /// Arcs, cosines, sines and lengths of variables and joints; the unknowns of rows.
    Span,
    /// First-order forms of features and sums of them.
    Row,
    /// Nodes that hold a posture and must not be called empty.
    Open,
}

impl Kinds {
    /// Every kind, in the order of the table.
    pub const ALL: [Kinds; 8] = [
        Kinds::Base,
        Kinds::Before,
        Kinds::After,
        Kinds::Tip,
        Kinds::Square,
        Kinds::Span,
        Kinds::Row,
        Kinds::Open,
    ];

    /// As the table names it.
    pub fn name(self) -> &'static str {
        match self {
            Kinds::Base => "base frame",
            Kinds::Before => "before joints",
            Kinds::After => "after joints",
            Kinds::Tip => "tip frame",
            Kinds::Square => "squared lengths",
            Kinds::Span => "spans",
            Kinds::Row => "rows",
            Kinds::Open => "nodes kept open",
        }
    }
}

/// Comparisons of one kind.
#[derive(Clone, Copy, Debug)]
pub struct Margins {
    /// How many.
    pub compared: u64,
    /// How many had the truth outside.
    pub violations: u64,
    /// Least distance of the truth from an end of a box that is not a single value, units.
    pub least: f64,
}

/// What a run found.
#[derive(Clone, Debug)]
pub struct Tally {
    /// Machines that were packed.
    pub machines: u64,
    /// Postures on them.
    pub postures: u64,
    /// Node tests: one posture in one box of spans, with all its boxes.
    pub checks: u64,
    /// By kind of comparison, in the order of the table.
    pub margins: [Margins; 8],
    /// The first few violations: everything needed to repeat them.
    pub failures: Vec<String>,
}

impl Default for Tally {
    fn default() -> Self {
        let none = Margins {
            compared: 0,
            violations: 0,
            least: f64::INFINITY,
        };
        Tally {
            machines: 0,
            postures: 0,
            checks: 0,
            margins: [none; 8],
            failures: Vec::new(),
        }
    }
}

impl Tally {
    /// Number of boxes that lost the truth and nodes called empty.
    pub fn violations(&self) -> u64 {
        self.margins.iter().map(|m| m.violations).sum()
    }

    /// The comparisons of one kind.
    pub fn of(&self, kind: Kinds) -> &Margins {
        &self.margins[kind as usize]
    }

    /// Both together.
    pub fn plus(mut self, other: Tally) -> Tally {
        self.machines += other.machines;
        self.postures += other.postures;
        self.checks += other.checks;
        for (own, others) in self.margins.iter_mut().zip(other.margins) {
            own.compared += others.compared;
            own.violations += others.violations;
            own.least = own.least.min(others.least);
        }
        self.failures.extend(other.failures);
        self.failures.truncate(8);
        self
    }

    /// Counts a comparison by the truth's distance from the nearer end, units: negative outside.
    pub fn note(&mut self, kind: Kinds, margin: f64, single: bool, what: impl Fn() -> String) {
        let margins = &mut self.margins[kind as usize];
        margins.compared += 1;
        if !single {
            margins.least = margins.least.min(margin);
        }
        // Not a number is no proof of containment.
        if margin.is_nan() || margin < -ALLOWANCE {
            margins.violations += 1;
            if self.failures.len() < 4 {
                self.failures
                    .push(format!("{}: {margin:.4} units: {}", kind.name(), what()));
            }
        }
    }

    /// The same for a value in an interval of 30 fraction bits.
    pub fn interval(&mut self, kind: Kinds, own: Interval, truth: f64, what: impl Fn() -> String) {
        let truth = truth * UNITS;
        let margin = (truth - f64::from(own.lo)).min(f64::from(own.hi) - truth);
        self.note(kind, margin, own.lo == own.hi, || {
            format!("{} {truth} in {own:?}", what())
        });
    }
}
