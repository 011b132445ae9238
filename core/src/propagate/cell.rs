//! One feature seen from one joint, and the rule of a turning or sliding joint.

use crate::fixed::{Arc, Empty, Interval, ONE_SQUARED, Product, root_down, root_up};

/// A vector of intervals.
pub type Vector = [Interval; 3];

/// A feature's position relative to a joint's origin (or its direction), before and after the
/// joint's motion.
#[derive(Clone, Copy, Debug)]
pub struct Cell {
    /// In the joint's frame before motion.
    pub before: Vector,
    /// In the frame after motion.
    pub after: Vector,
    /// Squared length before motion.
    pub square_before: Product,
    /// Squared length after motion.
    pub square_after: Product,
    /// Rules whose inputs changed since they last ran: [`Cell::JOINT`], [`Cell::LINK`].
    pub pending: u8,
}

impl Cell {
    /// The joint's rule is due.
    pub const JOINT: u8 = 1;
    /// The rule of the link before this joint is due.
    pub const LINK: u8 = 2;

    /// Nothing known but that no length exceeds one.
    pub const ANYTHING: Cell = Cell {
        before: [Interval::UNIT; 3],
        after: [Interval::UNIT; 3],
        square_before: Product {
            lo: 0,
            hi: ONE_SQUARED,
        },
        square_after: Product {
            lo: 0,
            hi: ONE_SQUARED,
        },
        pending: 0,
    };
}

/// What a node allows of one joint.
#[derive(Clone, Copy, Debug)]
pub struct JointSpan {
    /// Angles of a turning joint.
    pub arc: Arc,
    /// Cosine of a turning joint.
    pub cosine: Interval,
    /// Sine of a turning joint.
    pub sine: Interval,
    /// Length of a sliding joint.
    pub length: Interval,
}

impl JointSpan {
    /// A turning joint restricted to an arc.
    pub fn of_arc(arc: Arc) -> JointSpan {
        JointSpan {
            arc,
            cosine: arc.cosine(),
            sine: arc.sine(),
            length: Interval::ZERO,
        }
    }

    /// A sliding joint restricted to a range.
    pub fn of_length(length: Interval) -> JointSpan {
        JointSpan {
            arc: Arc::FULL,
            cosine: Interval::UNIT,
            sine: Interval::UNIT,
            length,
        }
    }

    /// Keeps the angles of `arc`; returns whether that changed anything worth a round.
    pub fn meet_arc(&mut self, arc: Arc) -> Result<bool, Empty> {
        if !self.arc.meet(arc)? {
            return Ok(false);
        }
        let cosine = self.cosine.meet(self.arc.cosine())?;
        let sine = self.sine.meet(self.arc.sine())?;
        Ok(cosine | sine)
    }

    /// Keeps the given cosine and sine; returns whether that changed anything worth a round.
    pub fn meet_circle(&mut self, cosine: Interval, sine: Interval) -> Result<bool, Empty> {
        let mut changed = self.cosine.meet(cosine)?;
        changed |= self.sine.meet(sine)?;
        if !changed {
            return Ok(false);
        }
        let one = Product {
            lo: ONE_SQUARED,
            hi: ONE_SQUARED,
        };
        self.cosine.meet_square(one.minus(self.sine.square()))?;
        self.sine.meet_square(one.minus(self.cosine.square()))?;
        if let Some((lo, hi)) = Arc::of_box(self.cosine, self.sine) {
            let arc = Arc::new(lo, hi).normalised();
            self.arc.meet(arc)?;
            self.cosine.meet(self.arc.cosine())?;
            self.sine.meet(self.arc.sine())?;
        }
        Ok(true)
    }
}

/// What a rule changed.
#[derive(Clone, Copy, Default)]
pub struct Changed {
    /// The vector before the joint.
    pub before: bool,
    /// The vector after the joint.
    pub after: bool,
    /// The joint's span.
    pub span: bool,
}

/// Tightens `own` by `x^2 + y^2 = radius`.
#[inline]
fn meet_radius(own: &mut [Interval], radius: Product) -> Result<bool, Empty> {
    let [x, y] = own else { return Ok(false) };
    let mut changed = x.meet_square(radius.minus(y.square()))?;
    changed |= y.meet_square(radius.minus(x.square()))?;
    Ok(changed)
}

/// The rule of a turning joint: `before = Rz(q) after`.
///
/// Equal third components, equal lengths, the rotation of the plane both ways, cosine and sine
/// from the dot and cross product, and the angle from the two directions.
pub fn turn(cell: &mut Cell, span: &mut JointSpan, sector: bool) -> Result<Changed, Empty> {
    let mut changed = Changed::default();
    let [mut wx, mut wy, mut wz] = cell.before;
    let [mut vx, mut vy, mut vz] = cell.after;

    changed.before |= wz.meet(vz)?;
    changed.after |= vz.meet(wz)?;
    let mut square = cell.square_before;
    square.meet(cell.square_after)?;

    let mut radius = wx.square().plus(wy.square());
    radius.meet(vx.square().plus(vy.square()))?;
    radius.meet(square.minus(wz.square()))?;
    square.meet(radius.plus(wz.square()))?;
    if wz.meet_square(square.minus(radius))? {
        changed.before = true;
        changed.after = true;
    }
    vz = wz;

    let mut w = [wx, wy];
    let mut v = [vx, vy];
    changed.before |= meet_radius(&mut w, radius)?;
    changed.after |= meet_radius(&mut v, radius)?;
    [wx, wy] = w;
    [vx, vy] = v;

    let (c, s) = (span.cosine, span.sine);
    changed.before |= wx.meet(c.times(vx).minus(s.times(vy)).round(0))?;
    changed.before |= wy.meet(s.times(vx).plus(c.times(vy)).round(0))?;
    changed.after |= vx.meet(c.times(wx).plus(s.times(wy)).round(0))?;
    changed.after |= vy.meet(c.times(wy).minus(s.times(wx)).round(0))?;

    if radius.lo > radius.hi >> 2 {
        let dot = wx.times(vx).plus(wy.times(vy));
        let cross = wy.times(vx).minus(wx.times(vy));
        if let (Some(cosine), Some(sine)) = (dot.over(radius), cross.over(radius)) {
            changed.span |= span.meet_circle(cosine, sine)?;
        }
    }
    if sector && !span.arc.full {
        let reach = Interval::clamped(root_down(radius.lo), root_up(radius.hi));
        if let Some((lo, hi)) = Arc::of_box(vx, vy) {
            let arc = Arc::new(lo, hi).normalised().plus(span.arc);
            if !arc.full {
                changed.before |= wx.meet(reach.times(arc.cosine()).round(0))?;
                changed.before |= wy.meet(reach.times(arc.sine()).round(0))?;
            }
        }
        if let Some((lo, hi)) = Arc::of_box(wx, wy) {
            let arc = Arc::new(lo, hi).normalised().plus(span.arc.negate());
            if !arc.full {
                changed.after |= vx.meet(reach.times(arc.cosine()).round(0))?;
                changed.after |= vy.meet(reach.times(arc.sine()).round(0))?;
            }
        }
    }
    if let (Some(to), Some(from)) = (Arc::of_box(wx, wy), Arc::of_box(vx, vy))
        && let Some(arc) = Arc::between(to, from, span.arc)
    {
        changed.span |= span.meet_arc(arc)?;
    }
    cell.before = [wx, wy, wz];
    cell.after = [vx, vy, vz];
    cell.square_before = square;
    cell.square_after = square;
    Ok(changed)
}

/// The rule of a sliding joint: `before = after + (0, 0, d)`.
pub fn slide(cell: &mut Cell, span: &mut JointSpan, point: bool) -> Result<Changed, Empty> {
    let mut changed = Changed::default();
    for k in 0..2 {
        let (before, after) = (cell.before[k], cell.after[k]);
        changed.before |= cell.before[k].meet(after)?;
        changed.after |= cell.after[k].meet(before)?;
    }
    let (mut wz, mut vz) = (cell.before[2], cell.after[2]);
    if point {
        let sum = |a: Interval, b: Interval| {
            Interval::clamped(a.lo as i64 + b.lo as i64, a.hi as i64 + b.hi as i64)
        };
        changed.before |= wz.meet(sum(vz, span.length))?;
        changed.after |= vz.meet(sum(wz, span.length.negate()))?;
        changed.span |= span.length.meet(sum(wz, vz.negate()))?;
    } else {
        changed.before |= wz.meet(vz)?;
        changed.after |= vz.meet(wz)?;
    }
    cell.before[2] = wz;
    cell.after[2] = vz;
    let radius = cell.before[0].square().plus(cell.before[1].square());
    let mut before = cell.square_before;
    let mut after = cell.square_after;
    before.meet(radius.plus(wz.square()))?;
    after.meet(radius.plus(vz.square()))?;
    changed.before |= cell.before[2].meet_square(before.minus(radius))?;
    changed.after |= cell.after[2].meet_square(after.minus(radius))?;
    cell.square_before = before;
    cell.square_after = after;
    Ok(changed)
}
