//! One posture on one packed machine: its boxes beside the truth, and spans that hold it.

use super::tally::{Kinds, Tally, UNITS};
use crate::truth::Truth;
use balk::pack::Pack;
use balk_core::fixed::{Arc, Direction, Interval, ONE};
use balk_core::machine::Motion;
use balk_core::propagate::cell::{JointSpan, Vector};
use balk_core::propagate::{Branch, Feature, Network, Spans};
use balk_core::relaxation::{NodeSimplex, relax};
use balk_core::rows::{Expansion, Form};
use balk_core::target::{Orientation, Target};
use nalgebra::{Quaternion, Unit, UnitQuaternion, Vector3};
use rand::Rng;
use std::f64::consts::TAU;

/// Pivots of the simplex at each node.
const PIVOTS: u32 = 200;

/// How far an angle lies inside an arc, units of 2^-30 radians; negative outside.
fn inside(arc: Arc, angle: f64) -> f64 {
    if arc.full {
        return f64::INFINITY;
    }
    let (sine, cosine) = angle.sin_cos();
    let (x, y) = (f64::from(arc.lo.x), f64::from(arc.lo.y));
    let past = (x * sine - y * cosine).atan2(x * cosine + y * sine);
    let (cross, dot) = (arc.lo.cross(arc.hi), arc.lo.dot(arc.hi));
    let sweep = (cross as f64).atan2(dot as f64).rem_euclid(TAU);
    // The nearer way round from either end.
    let inner = past.rem_euclid(TAU);
    let margin = if inner <= sweep {
        inner.min(sweep - inner)
    } else {
        -(inner - sweep).min(TAU - inner)
    };
    margin * UNITS
}

/// A posture on a packed machine and everything its boxes are compared with.
pub struct Case<'a> {
    /// The machine.
    pub pack: &'a Pack,
    /// Where everything is.
    pub truth: Truth,
    /// Values of the packed machine's variables: radians, or scaled lengths.
    pub variables: Vec<f64>,
    /// The tip axes the target speaks of, in the tip frame.
    pub axes: Vec<Vector3<f64>>,
    /// Where to find it again.
    pub name: String,
}

impl Case<'_> {
    fn motion(&self, variable: usize) -> Motion {
        self.pack.machine.variables[variable].motion
    }

    /// How far a variable's true value lies inside a span, units.
    fn margin(&self, span: &JointSpan, variable: usize) -> f64 {
        let truth = self.variables[variable];
        match self.motion(variable) {
            Motion::Turn => inside(span.arc, truth),
            Motion::Slide => (truth * UNITS - f64::from(span.length.lo))
                .min(f64::from(span.length.hi) - truth * UNITS),
        }
    }

    fn span(&self, span: &JointSpan, motion: Motion, truth: f64, what: &str, tally: &mut Tally) {
        let what = || format!("{}: {what}", self.name);
        match motion {
            Motion::Turn => {
                let margin = inside(span.arc, truth);
                tally.note(Kinds::Span, margin, false, || {
                    format!("{} {truth} in {:?}", what(), span.arc)
                });
                tally.interval(Kinds::Span, span.cosine, truth.cos(), what);
                tally.interval(Kinds::Span, span.sine, truth.sin(), what);
            }
            Motion::Slide => tally.interval(Kinds::Span, span.length, truth, what),
        }
    }

    fn spans(&self, spans: &Spans, when: &str, tally: &mut Tally) {
        for (v, span) in spans.iter().enumerate() {
            let what = format!("variable {v} {when}");
            self.span(span, self.motion(v), self.variables[v], &what, tally);
        }
    }

    /// One node test and everything it leaves behind. Returns the spans that are left.
    pub fn check(
        &self,
        network: &mut Network,
        spans: &Spans,
        simplex: &mut NodeSimplex,
        tally: &mut Tally,
    ) -> Spans {
        tally.checks += 1;
        let mut left = spans.clone();
        let open = network.propagate(&mut left).is_ok();
        self.open(open, "propagation", tally);
        if !open {
            return spans.clone();
        }
        self.views(network, tally);
        self.spans(&left, "after propagation", tally);
        let joints = network.joint_spans().iter().zip(&self.pack.machine.joints);
        for (i, (span, joint)) in joints.enumerate() {
            let what = format!("joint {}", i + 1);
            self.span(span, joint.motion, self.truth.value(i + 1), &what, tally);
        }
        self.rows(network, &left, tally);
        let open = relax(network, &mut left, simplex, PIVOTS).is_err();
        self.open(open, "linear program", tally);
        self.spans(&left, "after shaving", tally);
        left
    }

    fn open(&self, open: bool, by: &str, tally: &mut Tally) {
        let margin = if open { 0.0 } else { f64::NEG_INFINITY };
        tally.note(Kinds::Open, margin, true, || {
            format!("{}: empty by {by}", self.name)
        });
    }

    /// Every feature seen from everywhere.
    fn views(&self, network: &Network, tally: &mut Tally) {
        let count = self.truth.joints();
        for (f, &feature) in network.features().iter().enumerate() {
            let in_base = self.truth.in_base(feature, &self.axes);
            for joint in 0..=count + 1 {
                let truth = self.truth.view(&in_base, feature.is_point(), joint);
                let (before, after) = network.view(f, joint);
                let squares = network.squares(f, joint);
                let sides = [(before, squares.0, truth[0]), (after, squares.1, truth[1])];
                let (kinds, used) = match joint {
                    0 => ([Kinds::Base; 2], 1..2),
                    _ if joint > count => ([Kinds::Tip; 2], 0..1),
                    _ => ([Kinds::Before, Kinds::After], 0..2),
                };
                for side in used {
                    let (own, square, truth) = &sides[side];
                    let what = |k: &str| {
                        format!("{}: {feature:?} from {joint} side {side} {k}", self.name)
                    };
                    for k in 0..3 {
                        tally.interval(kinds[side], own[k], truth[k], || what(["x", "y", "z"][k]));
                    }
                    let size = truth.norm_squared() * UNITS;
                    let margin =
                        (size - square.lo as f64 / UNITS).min(square.hi as f64 / UNITS - size);
                    tally.note(Kinds::Square, margin, square.lo == square.hi, || {
                        format!("{} {size} in {square:?}", what("square"))
                    });
                }
            }
        }
    }

    /// Every first-order form at the truth, alone and combined.
    fn rows(&self, network: &Network, spans: &Spans, tally: &mut Tally) {
        let expansion = Expansion::new(network, spans);
        let deviations: Vec<f64> = spans
            .iter()
            .enumerate()
            .map(|(v, span)| match self.motion(v) {
                Motion::Turn => {
                    let middle = span.arc.middle();
                    let angle = f64::from(middle.y).atan2(f64::from(middle.x));
                    (self.variables[v] - angle).sin() * UNITS
                }
                Motion::Slide => {
                    let sum = i64::from(span.length.lo) + i64::from(span.length.hi);
                    self.variables[v] * UNITS - (sum >> 1) as f64
                }
            })
            .collect();
        for (v, (deviation, own)) in deviations.iter().zip(expansion.boxes()).enumerate() {
            let (Some(lo), Some(hi)) = (own.lower, own.upper) else {
                continue;
            };
            let margin = (deviation - lo as f64).min(hi as f64 - deviation);
            tally.note(Kinds::Span, margin, lo == hi, || {
                format!("{}: unknown {v} {deviation} in {own:?}", self.name)
            });
        }
        for (f, &feature) in network.features().iter().enumerate() {
            let views: Vec<Vector> = (1..=network.moved_by(f))
                .map(|joint| network.view(f, joint).1)
                .collect();
            if views.is_empty() {
                continue;
            }
            let forms = expansion.forms(&network.chain(), &views, feature.is_point());
            let truth = self.truth.in_base(feature, &self.axes) * UNITS;
            // A direction that differs from feature to feature and node to node.
            let weights = truth.map(|t| ((t * 1e3).sin() * UNITS / 2.0).round());
            let mut sum = Form::ZERO;
            for k in 0..3 {
                self.row(&forms[k], truth[k], &deviations, false, tally);
                sum.add(&forms[k], weights[k] as i64, 0);
            }
            let value = weights.dot(&truth) / UNITS;
            self.row(&sum, value, &deviations, true, tally);
        }
    }

    /// A form that stands for a quantity of this value (units). A weighted sum's room is as small
    /// as its weights and says nothing by itself.
    fn row(&self, form: &Form, value: f64, deviations: &[f64], weighted: bool, tally: &mut Tally) {
        let linear = form.between(Some(value.floor() as i64), Some(value.ceil() as i64));
        let row = linear.row();
        let sum: f64 = row
            .terms
            .iter()
            .map(|t| f64::from(t.coefficient) * deviations[t.unknown as usize])
            .sum();
        let low = row.range.lower.map_or(f64::INFINITY, |l| sum - l as f64);
        let high = row.range.upper.map_or(f64::INFINITY, |h| h as f64 - sum);
        tally.note(Kinds::Row, low.min(high) / UNITS, weighted, || {
            format!("{}: value {value}, terms {sum}, {:?}", self.name, row.range)
        });
    }

    /// A box of spans within limits that holds the posture: some as given, some cut around it.
    pub fn around(&self, random: &mut impl Rng, whole: &Spans) -> Spans {
        // From less than a unit to half a turn.
        let finest = random.random_range(-33.0..1.5);
        let mut size = || f64::exp2(random.random_range(finest..1.65f64));
        let mut spans = whole.clone();
        for (v, span) in spans.iter_mut().enumerate() {
            let (low, high) = (size(), size());
            let truth = self.variables[v];
            match self.motion(v) {
                Motion::Turn if low < 1.5 && low + high < TAU - 0.01 => {
                    let near = Arc::new(beside(truth, -low), beside(truth, high));
                    let mut arc = span.arc;
                    if arc.meet(near).is_ok() {
                        *span = JointSpan::of_arc(arc);
                    }
                }
                Motion::Slide if low < 1.5 => {
                    let (low, high) = ((truth - low) * UNITS, (truth + high) * UNITS);
                    let near = Interval::clamped(low.floor() as i64, high.ceil() as i64);
                    let mut length = span.length;
                    if length.meet(near).is_ok() {
                        *span = JointSpan::of_length(length);
                    }
                }
                _ => {}
            }
        }
        spans
    }

    /// The half that holds the posture of a random span that is worth cutting.
    pub fn half(&self, random: &mut impl Rng, spans: &Spans, tally: &mut Tally) -> Spans {
        let v = random.random_range(0..spans.len());
        let mut part = spans.clone();
        if spans[v].size(self.motion(v)) < 1 << 5 {
            return part;
        }
        let (lower, upper) = spans[v].halves(self.motion(v));
        let (low, high) = (self.margin(&lower, v), self.margin(&upper, v));
        tally.note(Kinds::Span, low.max(high), true, || {
            format!(
                "{}: variable {v} between {lower:?} and {upper:?}",
                self.name
            )
        });
        part[v] = if low > high { lower } else { upper };
        part
    }

    /// The part that holds the posture of the cut that the core chooses.
    pub fn branch(&self, network: &mut Network, spans: &Spans, tally: &mut Tally) -> Spans {
        let Branch::Cut {
            variable,
            lower,
            upper,
        } = network.branch(spans, 2)
        else {
            return spans.clone();
        };
        // The cut itself says which part holds the posture; what is left of it must, too.
        let (low, high) = spans[variable].halves(self.motion(variable));
        let low = self.margin(&low, variable) > self.margin(&high, variable);
        let part = if low { lower } else { upper };
        self.open(part.is_ok(), "cutting", tally);
        let Ok(part) = part else {
            return spans.clone();
        };
        self.spans(&part, "after a cut", tally);
        part
    }
}

/// The direction an angle away, moved on by single units until rounding has not brought it past.
fn beside(angle: f64, away: f64) -> Direction {
    let mut away = away;
    loop {
        let (y, x) = (angle + away).sin_cos();
        let end = Direction {
            x: (x * UNITS).round() as i32,
            y: (y * UNITS).round() as i32,
        };
        let (sine, cosine) = angle.sin_cos();
        let past = (cosine * f64::from(end.y) - sine * f64::from(end.x)) * away.signum();
        if away.abs() > 1e-6 || past >= 0.0 {
            return end;
        }
        away += away.signum() / UNITS;
    }
}

impl Case<'_> {
    /// The same target shrunk until the posture lies at its edge: no more than the rounding that the
    /// core's contract asks for is left. Often aimed so that a feature lies there, too.
    pub fn tight(&self, random: &mut impl Rng, target: &Target) -> Target {
        let place = self.truth.in_base(Feature::TipOrigin, &self.axes) * UNITS;
        let half_sine = |s: f64| ((s * UNITS).ceil() as i32).min(ONE);
        let turned = self.truth.tip_rotation();
        let mut tight = target.clone();
        tight.position =
            [0, 1, 2].map(|k| Interval::clamped(place[k].floor() as i64, place[k].ceil() as i64));
        match &mut tight.orientation {
            Orientation::Axes(cones) => {
                for (cone, axis) in cones.iter_mut().zip(&self.axes) {
                    let actual = turned * axis;
                    if let Some(turn) = self.aimed(random, &actual) {
                        cone.base = (turn * actual).map(|b| (b * UNITS).round() as i32).into();
                    }
                    // The direction the integers stand for, and half the chord to the axis.
                    let base = Vector3::from(cone.base.map(f64::from)).normalize();
                    cone.half_sine = half_sine((actual - base).norm() / 2.0);
                }
            }
            Orientation::Free => {}
            Orientation::Near {
                quaternion,
                half_sine: own,
            } => {
                let axis = turned * Vector3::ith(random.random_range(0..3), 1.0);
                if let Some(turn) = self.aimed(random, &axis) {
                    let wanted = turn * turned;
                    *quaternion = [wanted.w, wanted.i, wanted.j, wanted.k]
                        .map(|q| (q * UNITS).round() as i32);
                }
                let [w, x, y, z] = quaternion.map(f64::from);
                let wanted = UnitQuaternion::new_normalize(Quaternion::new(w, x, y, z));
                *own = half_sine((wanted.inverse() * turned).imag().norm());
            }
        }
        tight
    }

    /// A turn that moves an axis straight away from, or towards, a base axis or a joint's origin
    /// seen from the tip; then the inner product of the two is as large as the turn allows.
    fn aimed(&self, random: &mut impl Rng, axis: &Vector3<f64>) -> Option<UnitQuaternion<f64>> {
        let joint = random.random_range(0..=self.truth.joints()) as u8;
        let other = if joint == 0 {
            Vector3::ith(random.random_range(0..3), 1.0)
        } else {
            let feature = if random.random() {
                Feature::Axis(joint)
            } else {
                Feature::Origin(joint)
            };
            let tip = self.truth.in_base(Feature::TipOrigin, &self.axes);
            let seen = self.truth.in_base(feature, &self.axes);
            if feature.is_point() { seen - tip } else { seen }
        };
        let across = Unit::try_new(axis.cross(&other), 1e-3)?;
        let angle = f64::exp2(random.random_range(-20.0..1.6));
        let sign = if random.random() { 1.0 } else { -1.0 };
        Some(UnitQuaternion::from_axis_angle(&across, sign * angle))
    }
}
