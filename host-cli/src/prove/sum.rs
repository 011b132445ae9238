//! Combinations of relations: where boxes alone tell nothing, first-order terms may cancel.
//!
//! Every relation over the tip's origin and axes is expanded about the middle of what is known:
//! `b = sum g_z d_z + error`, with `|d_z|` at most half a width and the error of second order. A
//! linear program seeks multipliers under which the first-order terms nearly cancel and more of the
//! left sides remains than boxes and errors can explain (Farkas 1902; the mean value form of Moore,
//! *Interval Analysis*, 1966). It need not be trusted: see `FORMAT.md`, section 5, `sum`.

use super::interval::Interval;
use super::network::{Constraint, Equation, Network};
use balk_checker::proof::{Feature, Place, Relation};
use microlp::{ComparisonOp, LinearExpr, OptimizationDirection, Problem};
use std::collections::BTreeMap;

/// Largest multiplier.
const LARGEST: f64 = (1u64 << 24) as f64;
/// How much of the left side boxes and errors may explain for a combination to be worth writing.
const WORTH: f64 = 0.98;

/// Integer multipliers of constraints.
pub(super) type Sum = Vec<(i64, u32)>;

/// A relation about the middle: `constant = sum slopes d + error`, the error at most `slack`.
struct Expanded {
    constant: f64,
    slack: f64,
    slopes: Vec<(usize, f64)>,
}

impl Equation {
    fn expanded(&self, known: &[Interval]) -> Expanded {
        let half = |x: usize| 0.5 * known[x].width();
        let mut constant = self.range.middle();
        let mut slack = 0.5 * self.range.width();
        let mut slopes = BTreeMap::new();
        for term in &self.terms {
            let f = term.factor;
            let a = known[term.a].middle();
            match term.b {
                None => {
                    constant -= f * a;
                    *slopes.entry(term.a).or_insert(0.0) += f;
                }
                Some(b) if b == term.a => {
                    let square = half(b) * half(b);
                    constant -= f * (a * a + 0.5 * square);
                    slack += 0.5 * f.abs() * square;
                    *slopes.entry(b).or_insert(0.0) += 2.0 * f * a;
                }
                Some(b) => {
                    let middle = known[b].middle();
                    constant -= f * a * middle;
                    slack += f.abs() * half(term.a) * half(b);
                    *slopes.entry(term.a).or_insert(0.0) += f * middle;
                    *slopes.entry(b).or_insert(0.0) += f * a;
                }
            }
        }
        Expanded {
            constant,
            slack,
            slopes: slopes.into_iter().collect(),
        }
    }
}

/// Whether a relation speaks of the tip's pose alone, from the base to the tip frame.
fn of_tip(relation: Relation) -> bool {
    let tip = |f| matches!(f, Feature::Tip | Feature::TipAxis(_) | Feature::Cone(_));
    match relation {
        Relation::Turn(_, _, f)
        | Relation::Slide(_, _, f)
        | Relation::Out(_, _, f)
        | Relation::Length(Place::Base, f) => tip(f),
        Relation::Circle(_) | Relation::Trace | Relation::Cone(_) => true,
        _ => false,
    }
}

impl Network<'_> {
    fn equation_of(&self, number: u32) -> Option<&Equation> {
        match &self.constraints[number as usize] {
            Constraint::Equation(equation) => Some(equation),
            Constraint::Special(_) => None,
        }
    }

    /// The relation a constraint is.
    pub(super) fn relation_of(&self, number: u32) -> Option<Relation> {
        self.equation_of(number).map(|equation| equation.relation)
    }

    /// Whether a combination leaves no value.
    pub(super) fn contradicts(&self, sum: &Sum, known: &[Interval]) -> bool {
        let mut constant = 0.0;
        let mut explained = 0.0;
        let mut slopes: BTreeMap<usize, f64> = BTreeMap::new();
        for &(multiplier, number) in sum {
            let Some(equation) = self.equation_of(number) else {
                return false;
            };
            let expanded = equation.expanded(known);
            let multiplier = multiplier as f64;
            constant += multiplier * expanded.constant;
            explained += multiplier.abs() * (expanded.slack + 1e-14);
            for (x, slope) in expanded.slopes {
                *slopes.entry(x).or_insert(0.0) += multiplier * slope;
            }
        }
        for (x, slope) in slopes {
            explained += slope.abs() * 0.5 * known[x].width();
        }
        constant.abs() > explained * (1.0 + 1e-6)
    }

    /// Multipliers under which the relations of the tip contradict each other, if the linear
    /// program finds any. Cost: one linear program of some hundred rows.
    pub(super) fn combine(&self, known: &[Interval]) -> Option<Sum> {
        let rows: Vec<(u32, Expanded)> = (0..self.constraints.len() as u32)
            .filter_map(|number| {
                let equation = self.equation_of(number)?;
                of_tip(equation.relation).then(|| (number, equation.expanded(known)))
            })
            .collect();
        let largest = rows
            .iter()
            .map(|(_, row)| row.constant.abs())
            .fold(0.0, f64::max);
        if largest == 0.0 {
            return None;
        }
        let mut problem = Problem::new(OptimizationDirection::Minimize);
        let mut whole = LinearExpr::empty();
        let mut uses: BTreeMap<usize, LinearExpr> = BTreeMap::new();
        let mut multipliers = Vec::new();
        for (_, row) in &rows {
            let cost = row.slack + 1e-13;
            let [plus, minus] = [(); 2].map(|()| problem.add_var(cost, (0.0, f64::INFINITY)));
            for (variable, sign) in [(plus, 1.0), (minus, -1.0)] {
                whole.add(variable, sign * row.constant / largest);
                for &(x, slope) in &row.slopes {
                    if known[x].width() > 0.0 {
                        let empty = LinearExpr::empty;
                        uses.entry(x)
                            .or_insert_with(empty)
                            .add(variable, sign * slope);
                    }
                }
            }
            multipliers.push((plus, minus));
        }
        problem.add_constraint(whole, ComparisonOp::Eq, 1.0);
        for (x, form) in uses {
            // |form| = up + down at the optimum, with form = up - down.
            let cost = 0.5 * known[x].width();
            let [up, down] = [(); 2].map(|()| problem.add_var(cost, (0.0, f64::INFINITY)));
            let mut form = form;
            form.add(up, -1.0);
            form.add(down, 1.0);
            problem.add_constraint(form, ComparisonOp::Eq, 0.0);
        }
        let microlp::SolveOutcome::Solution(solution) = problem.solve().ok()? else {
            return None;
        };
        if solution.objective() / largest > WORTH {
            return None;
        }
        let values: Vec<f64> = multipliers
            .iter()
            .map(|&(p, m)| solution[p] - solution[m])
            .collect();
        let most = values
            .iter()
            .fold(0.0, |most: f64, value| most.max(value.abs()));
        let sum: Sum = rows
            .iter()
            .zip(values)
            .map(|((number, _), value)| ((value / most * LARGEST).round() as i64, *number))
            .filter(|(multiplier, _)| *multiplier != 0)
            .collect();
        self.contradicts(&sum, known).then_some(sum)
    }
}
