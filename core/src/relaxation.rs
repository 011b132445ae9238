//! The linear program of a node: rows chosen lazily, solved in single precision, and refused only
//! when the integer kernel confirms the multipliers.

use crate::certificate::{Combination, Range, Refuted};
use crate::fixed::{FRACTION_BITS, Interval, ONE, root_up};
use crate::machine::Variable;
use crate::propagate::cell::Vector;
use crate::propagate::{Goal, MOST_JOINTS, Network, Rules, Spans};
use crate::rows::{Expansion, Form, Linear};
use crate::simplex::{Outcome, Simplex};
use crate::target::MOST_CONES;
use heapless::Vec;

/// Most groups of rows: the tip's origin and axes, and as many turn limits.
const MOST_GROUPS: usize = 1 + 2 * MOST_CONES;
/// Most rows of one linear program: three for the tip's origin and each axis, and the turn limits.
pub const MOST_ROWS: usize = 16;
/// The simplex of a node.
pub type NodeSimplex = Simplex<MOST_ROWS, MOST_JOINTS>;

/// The program's rows come in groups that are added together: the tip's origin, each of its axes,
/// and the turn limits.
struct Rows<'n, 'a> {
    network: &'n Network<'a>,
    expansion: Expansion,
}

impl Rows<'_, '_> {
    /// Number of groups.
    fn groups(&self) -> usize {
        self.network.tip_features() + MOST_CONES
    }

    /// The linear forms of a feature's base coordinates.
    fn forms(&self, feature: usize) -> [Form; 3] {
        let views: Vec<Vector, MOST_JOINTS> = (1..=self.network.moved_by(feature))
            .map(|i| self.network.view(feature, i).1)
            .collect();
        let point = self.network.features()[feature].is_point();
        self.expansion.forms(&self.network.chain(), &views, point)
    }

    /// The rows of a group; fewer where there are none.
    fn group(&self, group: usize) -> Vec<Linear, 3> {
        let features = self.network.tip_features();
        if group >= features {
            return self.turn_limit(group - features);
        }
        if self.network.moved_by(group) == 0 {
            return Vec::new();
        }
        let base = self.network.view(group, 0).1;
        self.forms(group)
            .iter()
            .zip(base)
            .map(|(form, bound)| form.between(Some(bound.lo as i64), Some(bound.hi as i64)))
            .collect()
    }

    /// The angle between wanted and actual orientation, linearised at the middle posture: the
    /// trace, the sine in the direction of the turn, or the cosine of a cone.
    fn turn_limit(&self, number: usize) -> Vec<Linear, 3> {
        let mut rows = Vec::new();
        match self.network.goal() {
            Goal::Axes { cones, .. } => {
                if let Some(cone) = cones.get(number) {
                    let form = weighted(&self.forms(1 + number), &cone.wanted);
                    let least = cone.least.lo >> FRACTION_BITS;
                    let _ = rows.push(form.between(Some(least), None));
                }
            }
            Goal::Near {
                wanted,
                least,
                cosine,
                sine,
                ..
            } if number == 0 => {
                let forms = [1, 2, 3].map(|feature| self.forms(feature));
                let mut trace = Form::ZERO;
                for (forms, wanted) in forms.iter().zip(wanted) {
                    trace.add(&weighted(forms, wanted), ONE as i64 / 2, 0);
                }
                // Half the trace, so that coefficients fit.
                let least = least.lo >> (FRACTION_BITS + 1);
                let _ = rows.push(trace.between(Some(least), None));
                // Beyond a quarter turn the sine bounds nothing.
                if cosine.lo >= 0 {
                    let _ = rows.push(self.turn_sine(&forms, wanted, sine.hi as i64));
                }
            }
            Goal::Near { .. } => {}
        }
        rows
    }

    /// With the turn `w sin` between wanted and actual orientation, half the sum of the cross
    /// products of their columns: its part along any unit vector is at most the sine.
    fn turn_sine(&self, forms: &[[Form; 3]; 3], wanted: &[Vector; 3], sine: i64) -> Linear {
        let mut turn = [0i64; 3];
        let middle = |i: Interval| (i.lo as i64 + i.hi as i64) / 2;
        for (forms, wanted) in forms.iter().zip(wanted) {
            let (a, d) = (
                wanted.map(middle),
                [0, 1, 2].map(|k| forms[k].middle().clamp(-(ONE as i64), ONE as i64)),
            );
            for (k, turn) in turn.iter_mut().enumerate() {
                let (i, j) = ((k + 1) % 3, (k + 2) % 3);
                *turn += (a[i] * d[j] - a[j] * d[i]) >> FRACTION_BITS;
            }
        }
        let size = turn.iter().map(|t| (t >> 6) * (t >> 6)).sum::<i64>();
        let size = root_up(size).max(1);
        // Not longer than one: rounding towards zero.
        let along =
            turn.map(|t| (((t >> 6) << FRACTION_BITS) / size).clamp(-(ONE as i64), ONE as i64));
        let mut sum = Form::ZERO;
        for (forms, wanted) in forms.iter().zip(wanted) {
            let a = wanted.map(middle);
            for k in 0..3 {
                let (i, j) = ((k + 1) % 3, (k + 2) % 3);
                let weight = (along[i] * a[j] - along[j] * a[i]) >> (FRACTION_BITS + 1);
                sum.add(&forms[k], weight, 8);
            }
        }
        sum.between(None, Some(sine))
    }
}

/// The inner product of forms with a known vector.
fn weighted(forms: &[Form; 3], vector: &Vector) -> Form {
    let mut sum = Form::ZERO;
    for (form, v) in forms.iter().zip(vector) {
        let middle = (v.lo as i64 + v.hi as i64) / 2;
        sum.add(form, middle, v.width());
    }
    sum
}

/// Why the linear program of a node proves nothing.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Relaxed {
    /// Every row can be met.
    Feasible,
    /// The simplex ran out of pivots.
    OutOfPivots,
    /// The simplex found a contradiction that the kernel does not confirm, or ran into trouble.
    Unconfirmed,
}

/// Tries to show that a propagated node is empty, and shaves off what is.
///
/// `pivots` bounds the work of the simplex. Afterwards its point, if the rows can be met, is a
/// guess at a posture: see [`guess`].
///
/// # Errors
/// Why there is no proof. It does not mean that a posture exists.
pub fn relax(
    network: &Network,
    spans: &mut Spans,
    simplex: &mut NodeSimplex,
    pivots: u32,
) -> Result<Refuted, Relaxed> {
    if network.chain().joints.is_empty() {
        return Err(Relaxed::Feasible);
    }
    let rows = Rows {
        network,
        expansion: Expansion::new(network, spans),
    };
    let mut program = Program {
        rows: Vec::new(),
        boxes: rows.expansion.boxes().iter().copied().collect(),
        simplex,
        pivots,
    };
    let mut added = [false; MOST_GROUPS];
    program
        .simplex
        .start(program.boxes.iter().copied())
        .map_err(|_| Relaxed::Unconfirmed)?;
    while let Some((group, group_rows)) = rows.most_violated(program.simplex, &added) {
        added[group] = true;
        for linear in group_rows {
            if program.simplex.add_row(linear.row()).is_err() || program.rows.push(linear).is_err()
            {
                return Err(Relaxed::Unconfirmed);
            }
        }
        match program.solve() {
            Outcome::Feasible => {}
            Outcome::Infeasible => return program.confirm().ok_or(Relaxed::Unconfirmed),
            Outcome::OutOfPivots => return Err(Relaxed::OutOfPivots),
            Outcome::Unstable => return Err(Relaxed::Unconfirmed),
        }
        if program.rows.len() + 3 > MOST_ROWS {
            break;
        }
    }
    if network.rules().has(Rules::SHAVING) {
        program.shave(spans, network.chain().variables);
    }
    Err(Relaxed::Feasible)
}

/// The linear program of a node.
struct Program<'s> {
    rows: Vec<Linear, MOST_ROWS>,
    boxes: Vec<Range, MOST_JOINTS>,
    simplex: &'s mut NodeSimplex,
    pivots: u32,
}

impl Program<'_> {
    fn solve(&mut self) -> Outcome {
        let left = self.pivots.saturating_sub(self.simplex.pivots());
        self.simplex.solve(left)
    }

    /// Lets the kernel judge the simplex's contradiction over the present boxes.
    fn confirm(&self) -> Option<Refuted> {
        let mut multipliers = [0i32; MOST_ROWS];
        self.simplex.multipliers(&mut multipliers);
        let mut left_overs = [0i64; MOST_JOINTS];
        let mut sum = Combination::new(left_overs.get_mut(..self.boxes.len())?);
        for (linear, &multiplier) in self.rows.iter().zip(&multipliers) {
            sum = sum.add(multiplier, linear.row()).ok()?;
        }
        sum.refute(self.boxes.iter().copied()).ok()
    }

    /// Cuts off the ends of spans that the program shows empty, an eighth at a time.
    fn shave(&mut self, spans: &mut Spans, variables: &[Variable]) {
        for v in 0..self.boxes.len() {
            for upper in [false, true] {
                while let Some(rest) = self.cut_off(v, upper) {
                    self.boxes[v] = rest;
                }
            }
            spans[v].keep(self.boxes[v], variables[v].motion);
        }
    }

    /// What is left of a box when the end slice is shown empty.
    fn cut_off(&mut self, v: usize, upper: bool) -> Option<Range> {
        let whole = self.boxes[v];
        let (lo, hi) = (whole.lower?, whole.upper?);
        let slice = (hi - lo) / 8;
        if slice < 1 << 10 {
            return None;
        }
        let (cut, rest) = if upper {
            (
                Range::between(hi - slice, hi),
                Range::between(lo, hi - slice),
            )
        } else {
            (
                Range::between(lo, lo + slice),
                Range::between(lo + slice, hi),
            )
        };
        self.boxes[v] = cut;
        self.simplex.set_box(v, cut);
        let empty = self.solve() == Outcome::Infeasible && self.confirm().is_some();
        self.boxes[v] = whole;
        self.simplex.set_box(v, if empty { rest } else { whole });
        empty.then_some(rest)
    }
}

impl Rows<'_, '_> {
    /// The group not yet in the program whose rows the present point misses most.
    fn most_violated(
        &self,
        simplex: &NodeSimplex,
        added: &[bool],
    ) -> Option<(usize, Vec<Linear, 3>)> {
        let mut worst: Option<(f32, usize, Vec<Linear, 3>)> = None;
        for group in (0..self.groups()).filter(|&group| !added[group]) {
            let rows = self.group(group);
            let violation = rows
                .iter()
                .map(|linear| violation(linear, simplex))
                .fold(0.0, f32::max);
            if violation > 0.0 && worst.as_ref().is_none_or(|w| violation > w.0) {
                worst = Some((violation, group, rows));
            }
        }
        worst.map(|(_, group, rows)| (group, rows))
    }
}

/// How far the simplex's present point misses a row, in units of the unknowns.
fn violation(linear: &Linear, simplex: &NodeSimplex) -> f32 {
    let row = linear.row();
    let value: f32 = row
        .terms
        .iter()
        .map(|t| t.coefficient as f32 * simplex.value(t.unknown as usize).unwrap_or(0.0))
        .sum();
    let below = row.range.lower.map_or(0.0, |l| l as f32 - value);
    let above = row.range.upper.map_or(0.0, |u| value - u as f32);
    below.max(above)
}

/// Where the simplex's point lies in the node: for every variable the sine of the deviation from
/// the middle of its span (or the length from there), 30 fraction bits. Nothing depends on it.
pub fn guess(simplex: &NodeSimplex, variables: usize) -> Vec<f32, MOST_JOINTS> {
    (0..variables)
        .map(|v| simplex.value(v).unwrap_or(0.0))
        .collect()
}
