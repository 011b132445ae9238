//! Cutting what cannot be shown empty at once.

use super::Unproved;
use super::interval::Interval;
use super::leaf::Narrowing;
use super::network::Network;
use super::sum::Sum;
use balk_checker::proof::{Item, PICO, Span};

/// Variables tried before each cut.
const CANDIDATES: usize = 3;
/// Narrower than this (radians, or lengths of half the chain) a cut tells nothing.
const NARROWEST: f64 = 1e-7;

/// A part of the joint space.
struct Part {
    spans: Vec<Span>,
    known: Vec<Interval>,
    /// Steps taken from the root on.
    log: Vec<Narrowing>,
    /// Whether the last one leaves nothing.
    empty: bool,
    /// A combination that leaves nothing after all of them.
    sum: Option<Sum>,
}

/// A span as doubles.
pub(super) fn interval(span: &Span) -> Interval {
    Interval::new(span.lo as f64 / PICO as f64, span.hi as f64 / PICO as f64)
}

impl Network<'_> {
    /// The tree of a proof whose root has these spans, with at most `most` parts.
    pub(super) fn tree(&self, root: &[Span], most: u64) -> Result<Vec<Item>, Unproved> {
        let own: Vec<Interval> = root.iter().map(interval).collect();
        let mut part = Part {
            spans: root.to_vec(),
            known: self.at_start(&own),
            log: Vec::new(),
            empty: false,
            sum: None,
        };
        part.empty = self.refute(&mut part.known, &mut part.log, &[]);
        let mut items = Vec::new();
        let mut open = vec![part];
        let mut count = 0;
        while let Some(mut part) = open.pop() {
            count += 1;
            if count > most {
                return Err(Unproved::Parts(most));
            }
            if !part.empty {
                part.sum = self.combine(&part.known);
            }
            if part.empty || part.sum.is_some() {
                let own: Vec<Interval> = part.spans.iter().map(interval).collect();
                let sum = part.sum.as_ref();
                let steps = self.trim(&own, part.log, sum);
                items.extend(self.written(&own, &steps, sum).into_iter().map(Item::Step));
                continue;
            }
            let (variable, at, lower, upper) = self.cut(&part).ok_or(Unproved::Narrow)?;
            items.push(Item::Split {
                variable: variable as u8 + 1,
                at,
            });
            open.extend([upper, lower]);
        }
        Ok(items)
    }

    /// Tries the widest variables and keeps the cut after which least is left.
    fn cut(&self, part: &Part) -> Option<(usize, i64, Part, Part)> {
        let mut order: Vec<(f64, usize)> = (0..self.variables.len())
            .map(|v| (self.width(&part.known, v), v))
            .filter(|(width, _)| *width > NARROWEST)
            .collect();
        order.sort_by(|a, b| b.0.total_cmp(&a.0));
        let mut best: Option<(f64, (usize, i64, Part, Part))> = None;
        for &(_, variable) in order.iter().take(CANDIDATES) {
            let middle = part.known[self.variables[variable]].middle();
            let at = (middle * PICO as f64).round() as i64;
            let half = |upper: bool| {
                let mut spans = part.spans.clone();
                if upper {
                    spans[variable].lo = at;
                } else {
                    spans[variable].hi = at;
                }
                self.narrowed(part, spans, variable)
            };
            let (lower, upper) = (half(false), half(true));
            let left = |part: &Part| {
                if part.empty {
                    return 0.0;
                }
                let sum: f64 = (0..self.variables.len())
                    .map(|v| self.width(&part.known, v))
                    .sum();
                sum.powi(3)
            };
            let score = left(&lower) + left(&upper);
            if best.as_ref().is_none_or(|(least, _)| score < *least) {
                best = Some((score, (variable, at, lower, upper)));
            }
            if score == 0.0 {
                break;
            }
        }
        best.map(|(_, cut)| cut)
    }

    /// A half of a part, narrowed from what the whole knows.
    fn narrowed(&self, whole: &Part, spans: Vec<Span>, variable: usize) -> Part {
        let mut part = Part {
            known: whole.known.clone(),
            log: whole.log.clone(),
            empty: false,
            sum: None,
            spans,
        };
        let own = self.variables[variable];
        part.known[own] = part.known[own].meet(interval(&part.spans[variable]));
        let mut changed = vec![own];
        self.share(
            &mut part.known,
            variable,
            Some(&mut |value| changed.push(value)),
        );
        part.empty = self.refute(&mut part.known, &mut part.log, &changed);
        part
    }

    /// Width of a variable: radians, or lengths of half the chain.
    fn width(&self, known: &[Interval], variable: usize) -> f64 {
        let width = known[self.variables[variable]].width();
        let mut driven = self
            .chain
            .joints
            .iter()
            .filter(|joint| joint.variable == variable);
        if driven.any(|joint| !joint.revolute) {
            width * 2.0 / self.chain.length
        } else {
            width
        }
    }
}
