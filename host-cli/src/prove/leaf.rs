//! Showing one part empty, and keeping only the steps that are needed.

use super::interval::Interval;
use super::network::{Constraint, Network, Special};
use super::sum::Sum;
use balk_checker::proof::{Claim, PICO, Rule, Span, Step};
use std::collections::VecDeque;

/// Most steps taken in one part before it is given up.
const MOST_STEPS: usize = 4000;
/// A step is taken when it takes away more than this share of what is known: first coarse, then
/// fine.
const WORTH: [f64; 2] = [0.05, 0.005];
/// ... and more than this.
const LEAST: f64 = 1e-11;

/// One narrowing: which constraint, of what, and which ends are claimed.
#[derive(Clone, Copy)]
pub(super) struct Narrowing {
    constraint: u32,
    quantity: u32,
    lo: bool,
    hi: bool,
}

/// A bound in the proof's units, rounded outward, and as a double.
fn outward(allowed: Interval) -> (Option<i64>, Option<i64>) {
    const MOST: f64 = 9.0e6;
    let unit = PICO as f64;
    (
        (allowed.lo > -MOST && allowed.lo < MOST).then(|| (allowed.lo * unit).floor() as i64),
        (allowed.hi > -MOST && allowed.hi < MOST).then(|| (allowed.hi * unit).ceil() as i64),
    )
}

fn double(pico: i64) -> f64 {
    pico as f64 / PICO as f64
}

/// Whether nothing is left of what is known.
fn excludes(known: Interval, allowed: Interval) -> bool {
    allowed.lo > known.hi || allowed.hi < known.lo || allowed.lo > allowed.hi
}

impl Network<'_> {
    /// What is known at the start of a part with these spans.
    pub(super) fn at_start(&self, spans: &[Interval]) -> Vec<Interval> {
        let mut known = self.start.clone();
        for (v, span) in spans.iter().enumerate() {
            known[self.variables[v]] = *span;
        }
        for v in 0..spans.len() {
            self.share(&mut known, v, None);
        }
        known
    }

    /// Brings a variable and the joints it drives in line, calling `changed` for each.
    pub(super) fn share(
        &self,
        known: &mut [Interval],
        variable: usize,
        mut changed: Option<&mut dyn FnMut(usize)>,
    ) {
        let own = self.variables[variable];
        let mut span = known[own];
        for (joint, &value) in self.chain.joints.iter().zip(&self.values) {
            if joint.variable == variable
                && let Some(pulled) = joint.variable_of(known[value])
            {
                span = span.meet(pulled);
            }
        }
        known[own] = span;
        for (joint, &value) in self.chain.joints.iter().zip(&self.values) {
            if joint.variable == variable {
                let narrowed = known[value].meet(joint.value(span));
                if narrowed != known[value] {
                    known[value] = narrowed;
                    if let Some(changed) = changed.as_mut() {
                        changed(value);
                    }
                }
            }
        }
    }

    /// The variable a quantity belongs to, if it is a joint's value.
    fn variable_of(&self, quantity: usize) -> Option<usize> {
        self.values
            .iter()
            .position(|&value| value == quantity)
            .map(|joint| self.chain.joints[joint].variable)
    }

    /// Narrows until a contradiction or until nothing is worth a step, appending the steps to
    /// `log`. `changed` are the quantities that narrowed since the last time (none: everything is
    /// due).
    ///
    /// Returns whether there is a contradiction, which the last step then is.
    pub(super) fn refute(
        &self,
        known: &mut [Interval],
        log: &mut Vec<Narrowing>,
        changed: &[usize],
    ) -> bool {
        let most = log.len() + MOST_STEPS;
        for (pass, worth) in WORTH.into_iter().enumerate() {
            let due: Vec<u32> = if pass == 0 && !changed.is_empty() {
                let mut due: Vec<u32> = changed
                    .iter()
                    .flat_map(|&x| self.readers[x].iter().copied())
                    .collect();
                due.sort_unstable();
                due.dedup();
                due
            } else {
                (0..self.constraints.len() as u32).collect()
            };
            let mut queued = vec![false; self.constraints.len()];
            for &number in &due {
                queued[number as usize] = true;
            }
            let mut queue = VecDeque::from(due);
            while let Some(number) = queue.pop_front() {
                queued[number as usize] = false;
                let mut empty = false;
                let mut wake = Vec::new();
                self.narrow(
                    &self.constraints[number as usize],
                    known,
                    &mut |known, x, allowed| {
                        let own = known[x];
                        let mut entry = Narrowing {
                            constraint: number,
                            quantity: x as u32,
                            lo: false,
                            hi: false,
                        };
                        if excludes(own, allowed) {
                            log.push(entry);
                            empty = true;
                            return false;
                        }
                        let (lo, hi) = outward(allowed);
                        let least = (worth * own.width()).max(LEAST);
                        if let Some(lo) = lo.map(double).filter(|lo| lo - own.lo > least) {
                            entry.lo = true;
                            known[x].lo = lo;
                        }
                        if let Some(hi) = hi.map(double).filter(|hi| own.hi - hi > least) {
                            entry.hi = true;
                            known[x].hi = hi;
                        }
                        if entry.lo || entry.hi {
                            log.push(entry);
                            wake.push(x);
                            if let Some(v) = self.variable_of(x) {
                                self.share(known, v, Some(&mut |value| wake.push(value)));
                            }
                        }
                        true
                    },
                );
                if empty {
                    return true;
                }
                for x in wake.drain(..) {
                    for &reader in &self.readers[x] {
                        if !std::mem::replace(&mut queued[reader as usize], true) {
                            queue.push_back(reader);
                        }
                    }
                }
                if log.len() > most {
                    return false;
                }
            }
        }
        false
    }

    /// Keeps the steps a contradiction rests on.
    ///
    /// Without `sum` the last step is the contradiction, with it the combination after all steps.
    pub(super) fn trim(
        &self,
        spans: &[Interval],
        log: Vec<Narrowing>,
        sum: Option<&Sum>,
    ) -> Vec<Narrowing> {
        let mut kept = self.used(log, sum);
        let last = usize::from(sum.is_none());
        let mut size = kept.len().div_ceil(2);
        // Long ones are trimmed coarsely: the work grows with the square of the length.
        while size > kept.len() / 150 {
            let mut end = kept.len().saturating_sub(last);
            while end > 0 {
                let start = end.saturating_sub(size);
                let mut shorter = kept.clone();
                shorter.drain(start..end);
                if let Some(steps) = self.replay(spans, &shorter, sum) {
                    kept.truncate(steps);
                    shorter.truncate(steps);
                    kept = shorter;
                }
                end = start.min(kept.len().saturating_sub(last));
            }
            size /= 2;
        }
        // One end of a bound where that is enough.
        for at in (0..kept.len().saturating_sub(last)).rev() {
            if at + last >= kept.len() || !(kept[at].lo && kept[at].hi) {
                continue;
            }
            for lo in [true, false] {
                let mut looser = kept.clone();
                looser[at].lo = lo;
                looser[at].hi = !lo;
                if let Some(steps) = self.replay(spans, &looser, sum) {
                    looser.truncate(steps);
                    kept = looser;
                    break;
                }
            }
        }
        kept
    }

    /// The steps whose results others read, back from the last, each with the ends that are read.
    fn used(&self, log: Vec<Narrowing>, sum: Option<&Sum>) -> Vec<Narrowing> {
        // Lower and upper end of every quantity: whether something kept reads it.
        let mut read = vec![[false; 2]; self.quantities.len()];
        for (_, number) in sum.into_iter().flatten() {
            for x in self.inputs(&self.constraints[*number as usize]) {
                self.mark(&mut read, x, [true; 2]);
            }
        }
        let mut kept = Vec::new();
        for (at, entry) in log.iter().enumerate().rev() {
            let x = entry.quantity as usize;
            let mut entry = *entry;
            if sum.is_none() && at + 1 == log.len() {
                self.mark(&mut read, x, [true; 2]);
                self.mark_inputs(&mut read, &entry, [true; 2]);
                kept.push(entry);
                continue;
            }
            entry.lo &= read[x][0];
            entry.hi &= read[x][1];
            if !(entry.lo || entry.hi) {
                continue;
            }
            let own = [entry.lo, entry.hi];
            if self.variable_of(x).is_none() {
                // What was known before is not read through this bound.
                read[x] = [read[x][0] && !own[0], read[x][1] && !own[1]];
            }
            self.mark_inputs(&mut read, &entry, own);
            kept.push(entry);
        }
        kept.reverse();
        kept
    }

    /// Marks ends of a quantity as read; all joints of a variable are one quantity.
    fn mark(&self, read: &mut [[bool; 2]], x: usize, ends: [bool; 2]) {
        for (own, end) in read[x].iter_mut().zip(ends) {
            *own |= end;
        }
        if let Some(v) = self.variable_of(x) {
            for (joint, &value) in self.chain.joints.iter().zip(&self.values) {
                if joint.variable == v {
                    read[value] = [true; 2];
                }
            }
        }
    }

    /// Marks what a step reads to bound these ends of its quantity.
    fn mark_inputs(&self, read: &mut [[bool; 2]], entry: &Narrowing, ends: [bool; 2]) {
        let x = entry.quantity as usize;
        let constraint = &self.constraints[entry.constraint as usize];
        let Constraint::Equation(equation) = constraint else {
            for input in self.inputs(constraint) {
                self.mark(read, input, [true; 2]);
            }
            if let Constraint::Special(
                Special::Angle(i, _) | Special::AngleOfCircle(i) | Special::Sector(i, _),
            ) = constraint
            {
                self.mark(read, self.values[*i], [true; 2]);
            }
            return;
        };
        let own = equation
            .terms
            .iter()
            .find(|term| term.a == x || term.b == Some(x));
        let linear = own.filter(|term| term.b.is_none());
        for term in &equation.terms {
            match (linear, term.b) {
                (Some(own), None) if term.a != x => {
                    // The lower end reads the other's upper end when the signs agree.
                    let same = (own.factor > 0.0) == (term.factor > 0.0);
                    let needs = if same { [ends[1], ends[0]] } else { ends };
                    self.mark(read, term.a, needs);
                }
                (Some(_), None) => {}
                _ => {
                    for input in [Some(term.a), term.b].into_iter().flatten() {
                        // A product's other factor is read, the quantity itself only in a square.
                        if input != x || term.b == Some(term.a) {
                            self.mark(read, input, [true; 2]);
                        }
                    }
                }
            }
        }
    }

    /// Runs through steps again; how many it took to a contradiction, if there is one.
    fn replay(&self, spans: &[Interval], steps: &[Narrowing], sum: Option<&Sum>) -> Option<usize> {
        self.run(spans, steps, sum, |_, _, _| {})
    }

    /// The steps with their claims.
    pub(super) fn written(
        &self,
        spans: &[Interval],
        steps: &[Narrowing],
        sum: Option<&Sum>,
    ) -> Vec<Step> {
        let mut written: Vec<Step> = Vec::new();
        self.run(spans, steps, sum, |entry, lo, hi| {
            let claim = match (lo, hi) {
                (Some(lo), Some(hi)) => Claim::Within(Span { lo, hi }),
                (Some(lo), None) => Claim::AtLeast(lo),
                (None, Some(hi)) => Claim::AtMost(hi),
                (None, None) => Claim::Nothing,
            };
            written.push(Step {
                rule: self.rule(&self.constraints[entry.constraint as usize]),
                quantity: Some(self.quantities[entry.quantity as usize]),
                claim,
            });
        });
        if written
            .last()
            .is_none_or(|step| step.claim != Claim::Nothing)
        {
            let multiplied = |&(multiplier, number): &(i64, u32)| {
                self.relation_of(number)
                    .map(|relation| (multiplier, relation))
            };
            written.push(Step {
                rule: Rule::Sum(sum.into_iter().flatten().filter_map(multiplied).collect()),
                quantity: None,
                claim: Claim::Nothing,
            });
        }
        written
    }

    fn run(
        &self,
        spans: &[Interval],
        steps: &[Narrowing],
        sum: Option<&Sum>,
        mut claimed: impl FnMut(&Narrowing, Option<i64>, Option<i64>),
    ) -> Option<usize> {
        let mut known = self.at_start(spans);
        for (at, entry) in steps.iter().enumerate() {
            let x = entry.quantity as usize;
            let constraint = &self.constraints[entry.constraint as usize];
            let Some(allowed) = self.allowed(constraint, x, &mut known) else {
                continue;
            };
            if excludes(known[x], allowed) {
                claimed(entry, None, None);
                return Some(at + 1);
            }
            let (lo, hi) = outward(allowed);
            let lo = lo.filter(|lo| entry.lo && double(*lo) > known[x].lo);
            let hi = hi.filter(|hi| entry.hi && double(*hi) < known[x].hi);
            if lo.is_none() && hi.is_none() {
                continue;
            }
            claimed(entry, lo, hi);
            if let Some(lo) = lo {
                known[x].lo = double(lo);
            }
            if let Some(hi) = hi {
                known[x].hi = double(hi);
            }
            if let Some(v) = self.variable_of(x) {
                self.share(&mut known, v, None);
            }
        }
        sum.is_some_and(|sum| self.contradicts(sum, &known))
            .then_some(steps.len())
    }

    fn rule(&self, constraint: &Constraint) -> Rule {
        let number = |index: usize| index as u8 + 1;
        match constraint {
            Constraint::Equation(equation) => Rule::One(equation.relation),
            Constraint::Special(special) => match *special {
                Special::Cosine(i) => Rule::Cosine(number(i)),
                Special::Sine(i) => Rule::Sine(number(i)),
                Special::Angle(i, f) => Rule::Angle(number(i), f),
                Special::AngleOfCircle(i) => Rule::AngleOfCircle(number(i)),
                Special::Sector(i, f) => Rule::Sector(number(i), f),
                Special::Spread(f) => Rule::Spread(f),
                Special::SpreadCone(k, f) => Rule::SpreadCone(number(k), f),
                Special::Tilt(k) => Rule::Tilt(number(k)),
            },
        }
    }
}
