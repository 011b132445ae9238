//! Bound propagation around the loop base, joints, tip, target, base.
//!
//! A *feature* is a point or a direction fixed to one body: each joint's origin and axis, the
//! tip's origin and axes. Every feature is seen from every joint ([`cell::Cell`]); a joint turns
//! one view into the next, a link shifts it, and the target closes the loop. All rules only ever
//! shrink boxes by integer arithmetic rounded outward, so a box that becomes empty proves that no
//! posture within the spans meets the target.

mod branch;
pub mod cell;
pub mod link;
mod start;

use crate::fixed::{Arc, Empty, Interval, Product};
pub use crate::machine::Chain;
use crate::machine::{Joint, Motion, Placement};
pub use branch::Branch;
use cell::{Cell, JointSpan, Vector};
use heapless::Vec;
pub use start::Goal;

/// Most joints of any machine.
pub const MOST_JOINTS: usize = 8;
/// Most features of any machine.
pub const MOST_FEATURES: usize = 2 * MOST_JOINTS + 4;
/// Most rounds of propagation at one node.
const ROUNDS: usize = 12;

/// Which rules run. All of them, except in ablations.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Rules(pub u8);

impl Rules {
    /// Every rule: the union of those below.
    pub const ALL: Rules = Rules(
        Self::ORIGINS.0
            | Self::AXES.0
            | Self::BASE.0
            | Self::MUTUAL.0
            | Self::SPREAD.0
            | Self::SECTOR.0
            | Self::SHAVING.0,
    );
    /// Joint origins as features.
    pub const ORIGINS: Rules = Rules(1);
    /// Joint axes as features.
    pub const AXES: Rules = Rules(2);
    /// The first joint's origin and axis as features, seen back from the tip.
    pub const BASE: Rules = Rules(4);
    /// Equalities between two features seen from each other.
    pub const MUTUAL: Rules = Rules(8);
    /// Closing the loop by the angle to the wanted orientation, not only by the axes' boxes.
    pub const SPREAD: Rules = Rules(16);
    /// Turning by direction and radius, not only by cosine and sine.
    pub const SECTOR: Rules = Rules(32);
    /// Cutting off the ends of spans that the rows show empty.
    pub const SHAVING: Rules = Rules(64);

    /// Whether all of `other` are among these.
    pub fn has(self, other: Rules) -> bool {
        self.0 & other.0 == other.0
    }
}

/// What a feature is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Feature {
    /// Direction of a joint's axis.
    Axis(u8),
    /// Origin of a joint.
    Origin(u8),
    /// One of the tip axes the target speaks of.
    TipAxis(u8),
    /// Origin of the tip.
    TipOrigin,
}

impl Feature {
    /// Whether it is a point, not a direction.
    pub fn is_point(self) -> bool {
        matches!(self, Feature::Origin(_) | Feature::TipOrigin)
    }
}

/// What a node allows: one span for every variable.
pub type Spans = Vec<JointSpan, MOST_JOINTS>;

/// The features of a chain under one target, and the boxes of one node.
pub struct Network<'a> {
    chain: Chain<'a>,
    goal: &'a Goal,
    features: Vec<Feature, MOST_FEATURES>,
    tip_origin: usize,
    tip_axes: usize,
    rules: Rules,
    cells: &'a mut [Cell],
    joints: Vec<JointSpan, MOST_JOINTS>,
    /// Rounds run since the network was made.
    pub rounds: u32,
}

impl<'a> Network<'a> {
    /// Number of cells per feature: base, joints, tip.
    fn stride(&self) -> usize {
        self.chain.joints.len() + 2
    }

    /// Shrinks `spans` as far as the rules can.
    ///
    /// # Errors
    /// [`Empty`] proves that no posture within `spans` meets the target.
    pub fn propagate(&mut self, spans: &mut Spans) -> Result<(), Empty> {
        self.start(spans)?;
        for _ in 0..ROUNDS {
            self.rounds += 1;
            let mut any = false;
            for feature in 0..self.features.len() {
                any |= self.sweep(feature)?;
            }
            if self.rules.has(Rules::MUTUAL) {
                self.mutual()?;
            }
            self.share(spans)?;
            if !any {
                break;
            }
        }
        Ok(())
    }

    /// One feature around the loop, both ways. Returns whether any rule ran.
    fn sweep(&mut self, feature: usize) -> Result<bool, Empty> {
        let stride = self.stride();
        let count = stride - 2;
        let base = feature * stride;
        let mut any = false;
        for i in 1..=count + 1 {
            any |= self.link(feature, i)?;
            if i <= count {
                any |= self.joint(feature, i)?;
            }
        }
        if (self.cells[base].pending | self.cells[base + count + 1].pending) & Cell::JOINT != 0 {
            self.close(feature)?;
            any = true;
        }
        for i in (1..=count + 1).rev() {
            if i <= count {
                any |= self.joint(feature, i)?;
            }
            any |= self.link(feature, i)?;
        }
        Ok(any)
    }

    fn placement(&self, i: usize) -> &'a Placement {
        self.chain
            .joints
            .get(i - 1)
            .map_or(self.chain.tip, |joint| &joint.placement)
    }

    fn link(&mut self, feature: usize, i: usize) -> Result<bool, Empty> {
        let at = feature * self.stride() + i;
        if self.cells[at].pending & Cell::LINK == 0 {
            return Ok(false);
        }
        self.cells[at].pending &= !Cell::LINK;
        let placement = self.placement(i);
        let point = self.features[feature].is_point();
        let (left, right) = self.cells.split_at_mut(at);
        let (previous, next) = (&mut left[at - 1], &mut right[0]);
        let (back, forward) = link::link(previous, next, placement, point)?;
        if back {
            previous.pending |= Cell::JOINT;
        }
        if forward {
            next.pending |= Cell::JOINT;
        }
        Ok(true)
    }

    fn joint(&mut self, feature: usize, i: usize) -> Result<bool, Empty> {
        let stride = self.stride();
        let at = feature * stride + i;
        if self.cells[at].pending & Cell::JOINT == 0 {
            return Ok(false);
        }
        let cell = &mut self.cells[at];
        cell.pending &= !Cell::JOINT;
        let span = &mut self.joints[i - 1];
        let changed = match self.chain.joints[i - 1].motion {
            Motion::Turn => cell::turn(cell, span, self.rules.has(Rules::SECTOR))?,
            Motion::Slide => cell::slide(cell, span, self.features[feature].is_point())?,
        };
        if changed.before {
            cell.pending |= Cell::LINK;
        }
        if changed.after {
            self.cells[at + 1].pending |= Cell::LINK;
        }
        if changed.span {
            self.wake(i);
        }
        Ok(true)
    }

    /// Makes the rule of a joint due for every feature.
    fn wake(&mut self, i: usize) {
        let stride = self.stride();
        for cell in self.cells.iter_mut().skip(i).step_by(stride) {
            cell.pending |= Cell::JOINT;
        }
    }

    fn close(&mut self, feature: usize) -> Result<(), Empty> {
        let stride = self.stride();
        let (first, last) = (feature * stride, feature * stride + stride - 1);
        self.cells[first].pending &= !Cell::JOINT;
        self.cells[last].pending &= !Cell::JOINT;
        let kind = self.features[feature];
        if kind == Feature::TipOrigin {
            return Ok(());
        }
        let tip = self.cells[self.tip_origin * stride].after;
        let axis = |k: usize| self.cells[(self.tip_axes + k) * stride].after;
        if let Feature::TipAxis(k) = kind {
            self.turn_limit(k as usize)?;
            // The tip's axes close the loop for every other feature.
            if matches!(self.goal, Goal::Near { .. }) {
                for cell in self.cells.iter_mut().step_by(stride) {
                    cell.pending |= Cell::JOINT;
                }
                self.cells[first].pending &= !Cell::JOINT;
            }
            return Ok(());
        }
        let axes = match self.goal {
            Goal::Near { .. } => [axis(0), axis(1), axis(2)],
            Goal::Axes { cones, .. } if !cones.is_empty() => [axis(0); 3],
            _ => [[Interval::UNIT; 3]; 3],
        };
        let (left, right) = self.cells.split_at_mut(last);
        let (base, local) = (&mut left[first], &mut right[0]);
        let (at_base, at_tip) = match self.goal {
            Goal::Near {
                wanted,
                cosine,
                sine,
                ..
            } => {
                let tip = kind.is_point().then_some(&tip);
                let mut changed = link::close(base, local, &axes, tip)?;
                if self.rules.has(Rules::SPREAD) {
                    let more = link::close_within(base, local, wanted, (*cosine, *sine), tip)?;
                    changed.0 |= more.0;
                    changed.1 |= more.1;
                }
                changed
            }
            Goal::Axes { cones, .. } if kind.is_point() => match cones.first() {
                Some(cone) => {
                    let mut changed =
                        link::close_about_axis(base, local, &tip, &cone.in_tip, &axes[0])?;
                    if self.rules.has(Rules::SPREAD) {
                        let more = link::close_within_cone(base, local, cone, &tip)?;
                        changed.0 |= more.0;
                        changed.1 |= more.1;
                    }
                    changed
                }
                None => link::close_at_distance(base, local, &tip)?,
            },
            _ => (false, false),
        };
        if at_base {
            self.cells[first + 1].pending |= Cell::LINK;
        }
        if at_tip {
            self.cells[last].pending |= Cell::LINK;
        }
        Ok(())
    }

    /// The angle between wanted and actual orientation: the trace of their product, or the inner
    /// product of a cone's axis, is a linear function of the tip axes and bounded from below.
    fn turn_limit(&mut self, k: usize) -> Result<(), Empty> {
        let stride = self.stride();
        let axes = self.tip_axes;
        let at = |k: usize| (axes + k) * stride;
        match self.goal {
            Goal::Near { wanted, least, .. } => {
                // Once for all three, when the last one comes by.
                if k == 2 {
                    let mut own = [0, 1, 2].map(|k| self.cells[at(k)].after);
                    let changed = link::meet_least(&mut own, wanted, *least)?;
                    for (k, own) in own.iter().enumerate() {
                        self.cells[at(k)].after = *own;
                        if changed {
                            self.cells[at(k) + 1].pending |= Cell::LINK;
                        }
                    }
                }
            }
            Goal::Axes { cones, .. } => {
                let mut own = [self.cells[at(k)].after];
                let changed = link::meet_least(&mut own, &[cones[k].wanted], cones[k].least)?;
                self.cells[at(k)].after = own[0];
                if changed {
                    self.cells[at(k) + 1].pending |= Cell::LINK;
                }
            }
        }
        Ok(())
    }

    /// Two features seen from each other: equal distances, equal angles between axes.
    fn mutual(&mut self) -> Result<(), Empty> {
        let stride = self.stride();
        for (p, &first) in self.features.iter().enumerate() {
            for (q, &second) in self.features.iter().enumerate().skip(p + 1) {
                let ((Feature::Origin(a), Feature::Origin(b))
                | (Feature::Axis(a), Feature::Axis(b))) = (first, second)
                else {
                    continue;
                };
                let (at, to) = (q * stride + a as usize, p * stride + b as usize);
                let (mut one, mut two) = (self.cells[at], self.cells[to]);
                let (at_changed, to_changed) = if first.is_point() {
                    (
                        one.square_after.meet(two.square_after)?,
                        two.square_after.meet(one.square_after)?,
                    )
                } else {
                    (
                        one.after[2].meet(two.after[2])?,
                        two.after[2].meet(one.after[2])?,
                    )
                };
                self.cells[at] = one;
                self.cells[to] = two;
                for (changed, cell) in [(at_changed, at), (to_changed, to)] {
                    if changed {
                        self.cells[cell].pending |= Cell::JOINT;
                        self.cells[cell + 1].pending |= Cell::LINK;
                    }
                }
            }
        }
        Ok(())
    }

    /// Passes what a joint learned to its variable and on to the joints that follow it.
    fn share(&mut self, spans: &mut Spans) -> Result<(), Empty> {
        for (i, joint) in self.chain.joints.iter().enumerate() {
            let own = self.joints[i];
            let span = &mut spans[joint.variable as usize];
            match joint.motion {
                Motion::Turn if joint.is_plain() => {
                    span.meet_arc(own.arc)?;
                    span.meet_circle(own.cosine, own.sine)?;
                }
                Motion::Turn if joint.multiple == 1 => {
                    span.meet_arc(own.arc.plus(joint.turn.negate()))?;
                }
                Motion::Turn if joint.multiple == -1 => {
                    span.meet_arc(own.arc.negate().plus(joint.turn))?;
                }
                Motion::Slide if joint.multiple == 1 => {
                    span.length.meet(own.length.less(joint.shift))?;
                }
                Motion::Slide if joint.multiple == -1 => {
                    span.length.meet(joint.shift.less(own.length))?;
                }
                _ => {}
            }
        }
        for (i, joint) in self.chain.joints.iter().enumerate() {
            if joint.is_plain() {
                continue;
            }
            let derived = derive(joint, &spans[joint.variable as usize]);
            let own = &mut self.joints[i];
            let changed = match joint.motion {
                Motion::Turn => own.meet_arc(derived.arc)?,
                Motion::Slide => own.length.meet(derived.length)?,
            };
            if changed {
                self.wake(i + 1);
            }
        }
        Ok(())
    }

    /// The chain.
    pub fn chain(&self) -> Chain<'a> {
        self.chain
    }

    /// The rules in use.
    pub fn rules(&self) -> Rules {
        self.rules
    }

    /// The prepared target.
    pub fn goal(&self) -> &'a Goal {
        self.goal
    }

    /// What the node allows of every joint.
    pub fn joint_spans(&self) -> &[JointSpan] {
        &self.joints
    }

    /// How many features, the first ones, belong to the tip: its origin and the axes the target
    /// speaks of.
    pub fn tip_features(&self) -> usize {
        let axes = |feature: &&Feature| matches!(feature, Feature::TipAxis(_));
        1 + self.features.iter().filter(axes).count()
    }

    /// How many joints move a feature.
    pub fn moved_by(&self, feature: usize) -> usize {
        match self.features[feature] {
            Feature::Axis(joint) => joint as usize - 1,
            Feature::Origin(joint) => match self.chain.joints[joint as usize - 1].motion {
                Motion::Slide => joint as usize,
                Motion::Turn => joint as usize - 1,
            },
            Feature::TipAxis(_) | Feature::TipOrigin => self.chain.joints.len(),
        }
    }

    /// A box of one feature, for tests: in the joint's frame before and after motion.
    pub fn view(&self, feature: usize, joint: usize) -> (Vector, Vector) {
        let cell = &self.cells[feature * self.stride() + joint];
        (cell.before, cell.after)
    }

    /// The squared lengths of a view, for tests: before and after motion.
    pub fn squares(&self, feature: usize, joint: usize) -> (Product, Product) {
        let cell = &self.cells[feature * self.stride() + joint];
        (cell.square_before, cell.square_after)
    }

    /// The features in use.
    pub fn features(&self) -> &[Feature] {
        &self.features
    }
}

/// The span of a joint from that of its variable.
fn derive(joint: &Joint, span: &JointSpan) -> JointSpan {
    if joint.is_plain() {
        return *span;
    }
    match joint.motion {
        Motion::Turn => {
            let step = if joint.multiple < 0 {
                span.arc.negate()
            } else {
                span.arc
            };
            let mut arc = joint.turn;
            for _ in 0..joint.multiple.unsigned_abs() {
                arc = arc.plus(step);
            }
            JointSpan::of_arc(arc)
        }
        Motion::Slide => {
            let factor = joint.multiple as i64;
            let (a, b) = (
                span.length.lo as i64 * factor,
                span.length.hi as i64 * factor,
            );
            JointSpan::of_length(Interval::clamped(
                a.min(b) + joint.shift.lo as i64,
                a.max(b) + joint.shift.hi as i64,
            ))
        }
    }
}

/// Whether an arc is not worth telling apart from its middle.
pub fn is_tiny(arc: Arc) -> bool {
    !arc.is_wide() && arc.lo.cross(arc.hi) < 1 << 34
}
