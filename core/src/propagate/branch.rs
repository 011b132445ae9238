//! Cutting the span of a variable in two, and choosing which.

use super::cell::JointSpan;
use super::{Network, Spans};
use crate::fixed::{Direction, Empty, ONE};
use crate::machine::Motion;

/// What became of a node.
#[allow(
    clippy::large_enum_variant,
    reason = "there is no heap to put the parts on"
)]
pub enum Branch {
    /// One variable was cut; each part is propagated, or proved empty.
    Cut {
        /// Which variable.
        variable: usize,
        /// The lower part.
        lower: Result<Spans, Empty>,
        /// The upper part.
        upper: Result<Spans, Empty>,
    },
    /// No cut is worth making: every span is tiny.
    Narrow,
}

impl JointSpan {
    /// A measure of the width that grows with the angle or length: a quarter turn is 2^28.
    pub fn size(&self, motion: Motion) -> u32 {
        if motion == Motion::Slide {
            return self.length.width() as u32;
        }
        if self.arc.full {
            return 1 << 30;
        }
        self.arc.lo.sweep(self.arc.hi)
    }

    /// The two parts of the span.
    pub fn halves(&self, motion: Motion) -> (JointSpan, JointSpan) {
        match motion {
            Motion::Slide => {
                let middle = ((self.length.lo as i64 + self.length.hi as i64) >> 1) as i32;
                let (mut lower, mut upper) = (*self, *self);
                lower.length.hi = middle;
                upper.length.lo = middle;
                (lower, upper)
            }
            Motion::Turn => {
                let (lower, upper) = self.arc.halves();
                (JointSpan::of_arc(lower), JointSpan::of_arc(upper))
            }
        }
    }
}

impl Direction {
    /// The counter-clockwise way to another direction: a quarter turn is 2^28. Monotone in the
    /// angle, not proportional; precise to about 2^-28 of a turn.
    pub fn sweep(self, other: Direction) -> u32 {
        let (mut x, mut y) = (self.dot(other), self.cross(other));
        let mut quarters = 0;
        while !(x > 0 && y >= 0) && quarters < 3 {
            (x, y) = (y, -x);
            quarters += 1;
        }
        let (x, y) = ((x >> 31).max(0), (y >> 31).max(0));
        let part = (y << 28) / (x + y).max(1);
        (quarters << 28) + (part.min(ONE as i64 >> 2) as u32)
    }
}

/// Sorts sizes with their variables, the widest first, equal ones as they were: by insertion, for a
/// handful of them and without recursion.
fn widest_first(order: &mut [(u32, usize)]) {
    for end in 1..order.len() {
        for at in (1..=end).rev() {
            if order[at - 1].0 >= order[at].0 {
                break;
            }
            order.swap(at - 1, at);
        }
    }
}

impl Network<'_> {
    /// The cube of the sum of the widths: what is left to do in a node, roughly.
    ///
    /// Single precision proposes where to cut; nothing is refused by it.
    pub fn effort(&self, spans: &Spans) -> f32 {
        let sum = spans
            .iter()
            .zip(self.chain.variables)
            .map(|(span, variable)| span.size(variable.motion) as u64)
            .sum::<u64>() as f32
            / ONE as f32;
        sum * sum * sum
    }

    /// Cuts a propagated node: tries the `candidates` widest variables and keeps the cut after
    /// which least is left.
    ///
    /// A variable whose two parts are both empty is taken at once. Cost: two propagations per
    /// candidate.
    pub fn branch(&mut self, spans: &Spans, candidates: usize) -> Branch {
        let mut order: heapless::Vec<(u32, usize), { super::MOST_JOINTS }> = spans
            .iter()
            .zip(self.chain.variables)
            .enumerate()
            .map(|(v, (span, variable))| (span.size(variable.motion), v))
            .collect();
        widest_first(&mut order);
        let mut best: Option<(f32, Branch)> = None;
        for &(size, variable) in order.iter().take(candidates) {
            // Narrower than about 2^-26 of a turn, or of the reach, a cut tells nothing.
            if size < 1 << 5 {
                break;
            }
            let motion = self.chain.variables[variable].motion;
            let (low, high) = spans[variable].halves(motion);
            let mut part = |half: JointSpan| {
                let mut part = spans.clone();
                part[variable] = half;
                self.propagate(&mut part).map(|()| part)
            };
            let (lower, upper) = (part(low), part(high));
            let score = [&lower, &upper]
                .into_iter()
                .flatten()
                .map(|part| self.effort(part))
                .sum();
            let done = lower.is_err() && upper.is_err();
            if best.as_ref().is_none_or(|(least, _)| score < *least) {
                best = Some((
                    score,
                    Branch::Cut {
                        variable,
                        lower,
                        upper,
                    },
                ));
            }
            if done {
                break;
            }
        }
        best.map_or(Branch::Narrow, |(_, branch)| branch)
    }
}
