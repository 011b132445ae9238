//! What is known of every quantity at the current node.

use std::collections::HashMap;

use dashu_int::IBig;
use dashu_ratio::RBig;

use crate::exact::interval::Interval;
use crate::machine::Drive;
use crate::problem::Problem;
use crate::proof::Quantity;

/// Bounds of quantities, with a trail by which they are taken back.
pub struct Known<'a> {
    problem: &'a Problem<'a>,
    bounds: HashMap<Quantity, Interval>,
    trail: Vec<(Quantity, Option<Interval>)>,
}

impl<'a> Known<'a> {
    /// What is known at the root, whose variables lie in `root`.
    pub fn new(problem: &'a Problem<'a>, root: &[Interval]) -> Self {
        let mut known = Self {
            problem,
            bounds: HashMap::new(),
            trail: Vec::new(),
        };
        for (variable, span) in (1u8..).zip(root) {
            known.set(Quantity::Variable(variable), span.clone());
        }
        for (joint, moving) in (1u8..).zip(&problem.chain.moving) {
            if let Some(span) = root.get(moving.drive.variable) {
                known.set(Quantity::Value(joint), image(&moving.drive, span));
            }
        }
        known
    }

    /// What is known of `quantity`.
    pub fn get(&self, quantity: Quantity) -> Interval {
        match self.bounds.get(&quantity) {
            Some(bound) => bound.clone(),
            None => self.problem.start(quantity),
        }
    }

    /// Says that `quantity` lies in `bound`, which is within what is known; a variable and the
    /// joints it drives follow each other. False if nothing is left of one of them.
    #[must_use]
    pub fn narrow(&mut self, quantity: Quantity, bound: Interval) -> bool {
        let place = |number: u8| usize::from(number).checked_sub(1);
        let variable = match quantity {
            Quantity::Variable(variable) => place(variable),
            Quantity::Value(joint) => {
                let moving = place(joint).and_then(|place| self.problem.chain.moving.get(place));
                moving.map(|moving| moving.drive.variable)
            }
            _ => None,
        };
        let possible = !bound.is_empty();
        self.set(quantity, bound);
        match variable {
            Some(variable) => possible && self.follow(quantity, variable),
            None => possible,
        }
    }

    /// Brings what is known of a variable and of all joints it drives together after `changed`.
    fn follow(&mut self, changed: Quantity, variable: usize) -> bool {
        let Ok(number) = u8::try_from(variable + 1) else {
            return false;
        };
        let leader = Quantity::Variable(number);
        let mut span = self.get(leader);
        let moving = &self.problem.chain.moving;
        if let Quantity::Value(joint) = changed
            && let Some(moving) = moving.get(usize::from(joint).wrapping_sub(1))
            && let Some(values) = preimage(&moving.drive, &self.get(changed))
        {
            span = span.meet(&values);
        }
        let mut possible = !span.is_empty();
        self.set(leader, span.clone());
        for (joint, moving) in (1u8..).zip(moving) {
            if moving.drive.variable == variable {
                let value = Quantity::Value(joint);
                let bound = self.get(value).meet(&image(&moving.drive, &span));
                possible &= !bound.is_empty();
                self.set(value, bound);
            }
        }
        possible
    }

    /// Where the trail stands; later bounds can be taken back to here.
    pub fn mark(&self) -> usize {
        self.trail.len()
    }

    /// Takes back all bounds since `mark`.
    pub fn take_back(&mut self, mark: usize) {
        for (quantity, before) in self.trail.drain(mark.min(self.trail.len())..).rev() {
            match before {
                Some(bound) => self.bounds.insert(quantity, bound),
                None => self.bounds.remove(&quantity),
            };
        }
    }

    fn set(&mut self, quantity: Quantity, bound: Interval) {
        let before = self.bounds.insert(quantity, bound);
        self.trail.push((quantity, before));
    }
}

/// Values of the joint for the variable's values `span`.
pub fn image(drive: &Drive, span: &Interval) -> Interval {
    let denominator = IBig::from(drive.ratio.denominator().clone());
    let values = span.scale(drive.ratio.numerator()).shrink(&denominator);
    &values + &drive.offset.enclosure()
}

/// Values of the variable for the joint's `values`; `None` if the joint does not follow.
fn preimage(drive: &Drive, values: &Interval) -> Option<Interval> {
    if drive.ratio == RBig::ZERO {
        return None;
    }
    let moved = values - &drive.offset.enclosure();
    let scaled = moved.scale(&drive.ratio.denominator().clone().into());
    scaled.over(&Interval::point(drive.ratio.numerator().clone()))
}
