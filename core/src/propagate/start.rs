//! The target as boxes, and the boxes a node starts from.

use super::cell::{Cell, JointSpan, Vector};
use super::{Chain, Feature, MOST_FEATURES, Network, Rules, Spans, derive};
use crate::fixed::{Empty, Interval, ONE, ONE_SQUARED, Product, root_up};
use crate::machine::Motion;
use crate::target::{MOST_CONES, Orientation, Target};
use heapless::Vec;

/// A tip axis and the box its direction in the base frame lies in.
#[derive(Clone, Copy, Debug)]
pub struct GoalCone {
    /// The axis in the tip frame.
    pub in_tip: Vector,
    /// Where it may point in the base frame.
    pub in_base: Vector,
    /// The middle of the cone.
    pub wanted: Vector,
    /// Least inner product of the axis with it.
    pub least: Product,
    /// Cosine of the cone's angle.
    pub cosine: Interval,
    /// Its sine.
    pub sine: Interval,
}

/// A target prepared for propagation.
#[derive(Clone, Debug)]
pub enum Goal {
    /// Position box, and cones for the tip's axes (none: orientation free).
    Axes {
        /// Where the tip may be.
        position: Vector,
        /// Where its axes may point.
        cones: Vec<GoalCone, MOST_CONES>,
    },
    /// Position box and boxes for all three tip axes.
    Near {
        /// Where the tip may be.
        position: Vector,
        /// Where its axes may point.
        axes: [Vector; 3],
        /// The wanted orientation's columns.
        wanted: [Vector; 3],
        /// Least trace of the product of the wanted orientation's transpose and the actual one.
        least: Product,
        /// Cosine of the greatest turn between them.
        cosine: Interval,
        /// Its sine.
        sine: Interval,
    },
}

/// Where a unit vector's component may be after a turn by at most the given angle.
///
/// With the component `cos(a)` and the angle `w` that is `[cos(a + w), cos(a - w)]`, cut off at
/// one and minus one.
fn spread(component: Interval, cosine: Interval, sine: Interval) -> Interval {
    let upper = |a: i32| {
        if a >= cosine.lo {
            return ONE;
        }
        let across = root_up(ONE_SQUARED - a as i64 * a as i64).min(ONE as i64) as i32;
        let sum = Interval::point(a)
            .times(cosine)
            .plus(Interval::point(across).times(sine));
        sum.round(1).hi.min(ONE)
    };
    Interval {
        lo: -upper(-component.lo),
        hi: upper(component.hi),
    }
}

/// Bounds of `d . x` for every unit vector `d` within the given angle of a vector whose inner
/// product with `x` lies in `nominal`; `square` bounds the squared length of `x`.
pub(super) fn spread_product(
    nominal: Product,
    square: Product,
    cosine: Interval,
    sine: Interval,
) -> Interval {
    let length = root_up(square.hi).min(ONE as i64);
    let upper = |n: i64| {
        // n / 2^30 against length * cosine.
        let n = -((-n) >> 30);
        if n >= (length * cosine.lo as i64) >> 30 {
            return length;
        }
        let across = root_up(square.hi - n * n).min(ONE as i64);
        let (near, far) = (n * cosine.lo as i64, n * cosine.hi as i64);
        (-((-(near.max(far) + across * sine.hi as i64)) >> 30)).min(length)
    };
    Interval::clamped(-upper(-nominal.lo), upper(nominal.hi))
}

/// Cosine and sine of an angle from the sine of its half.
fn from_half_sine(half: i32) -> (Interval, Interval) {
    let half = half.clamp(0, ONE);
    let square = half as i64 * half as i64;
    let cosine = Product {
        lo: ONE_SQUARED - 2 * square,
        hi: ONE_SQUARED - 2 * square,
    }
    .round(0);
    let half_cosine = root_up(ONE_SQUARED - square).min(ONE as i64);
    let sine = Interval::clamped(0, ((2 * half as i64 * half_cosine) >> 30) + 1);
    (cosine, sine)
}

/// The columns of the rotation matrix of a quaternion; none when a component exceeds one or the
/// length is below one half.
///
/// Sums of four products of components stay within 2^62.
fn columns(quaternion: [i32; 4]) -> Option<[Vector; 3]> {
    if quaternion.iter().any(|q| q.unsigned_abs() > ONE as u32) {
        return None;
    }
    let [w, x, y, z] = quaternion.map(Interval::point);
    let square = |a: Interval| a.square();
    let norm = square(w).plus(square(x)).plus(square(y)).plus(square(z));
    if norm.lo < ONE_SQUARED >> 2 {
        return None;
    }
    let diagonal = |a: Interval, b: Interval, c: Interval| {
        square(w).plus(square(a)).minus(square(b)).minus(square(c))
    };
    let off = |a: Interval, b: Interval, c: Interval, plus: bool| {
        let (first, second) = (a.times(b).double(), w.times(c).double());
        if plus {
            first.plus(second)
        } else {
            first.minus(second)
        }
    };
    let entry = |p: Product| p.over(norm).map_or(Interval::UNIT, |i| i);
    Some([
        [
            entry(diagonal(x, y, z)),
            entry(off(x, y, z, true)),
            entry(off(x, z, y, false)),
        ],
        [
            entry(off(x, y, z, false)),
            entry(diagonal(y, x, z)),
            entry(off(y, z, x, true)),
        ],
        [
            entry(off(x, z, y, true)),
            entry(off(y, z, x, false)),
            entry(diagonal(z, x, y)),
        ],
    ])
}

/// A unit vector given to within two units.
fn rounded(vector: [i32; 3]) -> Vector {
    vector.map(|v| Interval::clamped(v as i64 - 2, v as i64 + 2))
}

impl Goal {
    /// Prepares a target. Cost: nine divisions for a full orientation.
    pub fn new(target: &Target) -> Goal {
        let position = target.position;
        match &target.orientation {
            Orientation::Free => Goal::Axes {
                position,
                cones: Vec::new(),
            },
            Orientation::Axes(cones) => Goal::Axes {
                position,
                cones: cones
                    .iter()
                    .map(|cone| {
                        let (cosine, sine) = from_half_sine(cone.half_sine);
                        GoalCone {
                            in_tip: rounded(cone.tip),
                            in_base: rounded(cone.base).map(|b| spread(b, cosine, sine)),
                            wanted: rounded(cone.base),
                            least: cosine.widen(),
                            cosine,
                            sine,
                        }
                    })
                    .collect(),
            },
            Orientation::Near {
                quaternion,
                half_sine,
            } => {
                let (cosine, sine) = from_half_sine(*half_sine);
                let Some(wanted) = columns(*quaternion) else {
                    return Goal::Axes {
                        position,
                        cones: Vec::new(),
                    };
                };
                Goal::Near {
                    position,
                    axes: wanted.map(|column| column.map(|entry| spread(entry, cosine, sine))),
                    wanted,
                    least: cosine.widen().double().plus(Interval::point(ONE).widen()),
                    cosine,
                    sine,
                }
            }
        }
    }

    fn position(&self) -> Vector {
        match self {
            Goal::Axes { position, .. } | Goal::Near { position, .. } => *position,
        }
    }
}

impl<'a> Network<'a> {
    /// Chooses the features of a chain under a target. `cells` must hold
    /// [`cells_for`](crate::screen::cells_for) cells, as `screen` sees to.
    pub fn new(
        chain: Chain<'a>,
        goal: &'a Goal,
        rules: Rules,
        cells: &'a mut [Cell],
    ) -> Network<'a> {
        let mut features: Vec<Feature, MOST_FEATURES> = Vec::new();
        let closed = matches!(goal, Goal::Near { .. });
        // The tip comes first: it carries the target into the network.
        let mut push = |feature| {
            let _ = features.push(feature);
        };
        push(Feature::TipOrigin);
        let tip_axes = match goal {
            Goal::Near { .. } => 3,
            Goal::Axes { cones, .. } => cones.len() as u8,
        };
        (0..tip_axes).for_each(|k| push(Feature::TipAxis(k)));
        for (i, joint) in chain.joints.iter().enumerate() {
            let number = i as u8 + 1;
            // A shorter offset than a thousandth of a thousandth of the reach tells nothing.
            let offset = joint.placement.square.hi > ONE_SQUARED >> 40;
            if rules.has(if i == 0 { Rules::BASE } else { Rules::ORIGINS })
                && (if i == 0 { closed } else { offset })
            {
                push(Feature::Origin(number));
            }
        }
        for (i, joint) in chain.joints.iter().enumerate() {
            let number = i as u8 + 1;
            let parallel = joint.placement.rotation[2][2].unsigned_abs() == ONE as u32;
            if rules.has(if i == 0 { Rules::BASE } else { Rules::AXES })
                && closed
                && (!parallel || i == 0)
            {
                push(Feature::Axis(number));
            }
        }
        let room = cells.len() / (chain.joints.len() + 2);
        features.truncate(room);
        Network {
            chain,
            goal,
            features,
            tip_origin: 0,
            tip_axes: 1,
            rules,
            cells,
            joints: Vec::new(),
            rounds: 0,
        }
    }

    /// Boxes before the first round: what is constant in some frame, and the target.
    pub(super) fn start(&mut self, spans: &Spans) -> Result<(), Empty> {
        self.joints = self
            .chain
            .joints
            .iter()
            .map(|joint| derive(joint, &spans[joint.variable as usize]))
            .collect();
        let stride = self.chain.joints.len() + 2;
        for (f, &feature) in self.features.iter().enumerate() {
            let cells = &mut self.cells[f * stride..(f + 1) * stride];
            cells.fill(Cell::ANYTHING);
            if !feature.is_point() {
                let one = Product {
                    lo: ONE_SQUARED,
                    hi: ONE_SQUARED,
                };
                for cell in cells.iter_mut() {
                    cell.square_before = one;
                    cell.square_after = one;
                }
            }
            // Every rule is due once the constants are in place.
            for cell in cells.iter_mut() {
                cell.pending = Cell::JOINT | Cell::LINK;
            }
            let last = stride - 1;
            match feature {
                Feature::TipOrigin => {
                    fix(&mut cells[last], [Interval::ZERO; 3]);
                    let mut position = [Interval::UNIT; 3];
                    for (own, wanted) in position.iter_mut().zip(self.goal.position()) {
                        own.meet(wanted)?;
                    }
                    cells[0].after = position;
                }
                Feature::TipAxis(k) => {
                    let k = k as usize;
                    let (in_tip, in_base) = match self.goal {
                        Goal::Near { axes, .. } => {
                            let mut unit = [Interval::ZERO; 3];
                            unit[k] = Interval::point(ONE);
                            (unit, axes[k])
                        }
                        Goal::Axes { cones, .. } => (cones[k].in_tip, cones[k].in_base),
                    };
                    cells[last].before = in_tip;
                    cells[0].after = in_base;
                }
                Feature::Axis(number) => {
                    let cell = &mut cells[number as usize];
                    let axis = [Interval::ZERO, Interval::ZERO, Interval::point(ONE)];
                    cell.before = axis;
                    cell.after = axis;
                }
                Feature::Origin(number) => {
                    let i = number as usize;
                    match self.chain.joints[i - 1].motion {
                        Motion::Turn => fix(&mut cells[i], [Interval::ZERO; 3]),
                        Motion::Slide => {
                            let cell = &mut cells[i];
                            cell.after = [Interval::ZERO; 3];
                            cell.square_after = Product::ZERO;
                            cell.before[0] = Interval::ZERO;
                            cell.before[1] = Interval::ZERO;
                        }
                    }
                }
            }
        }
        Ok(())
    }
}

/// A cell whose feature is the joint's own origin.
fn fix(cell: &mut Cell, vector: Vector) {
    cell.before = vector;
    cell.after = vector;
    cell.square_before = Product::ZERO;
    cell.square_after = Product::ZERO;
}

impl JointSpan {
    /// Whether nothing is left to split.
    pub fn is_point(&self) -> bool {
        self.length.width() == 0 && !self.arc.full && super::is_tiny(self.arc)
    }
}
