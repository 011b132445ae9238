//! The node test on machines made of integers: every box and every row must hold the truth.

use super::planted::{Planted, UNITS, pick};
use balk_core::fixed::{Arc, Direction, Interval, ONE};
use balk_core::machine::Motion;
use balk_core::propagate::cell::{Cell, JointSpan};
use balk_core::propagate::{Feature, Goal, Network, Spans};
use balk_core::relaxation::{NodeSimplex, relax};
use balk_core::rows::Expansion;
use balk_core::screen::{Options, Verdict, Workspace8, cells_for, limits, screen};
use balk_core::target::{Cone, Orientation, Target};
use nalgebra::Vector3;
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
use std::f64::consts::TAU;

fn holds(bounds: Interval, value: f64) -> bool {
    let value = value * UNITS;
    f64::from(bounds.lo) <= value + 1e-3 && value - 1e-3 <= f64::from(bounds.hi)
}

fn holds_angle(arc: Arc, at: f64) -> bool {
    let angle = |d: Direction| f64::from(d.y).atan2(f64::from(d.x));
    let from_start = |a: f64| (a - angle(arc.lo) + 1e-14).rem_euclid(TAU);
    arc.full || from_start(at) <= from_start(angle(arc.hi)) + 2e-14
}

impl Planted {
    fn assert_spans(&self, spans: &Spans, seed: u64) {
        for ((span, variable), &value) in spans
            .iter()
            .zip(&self.machine.variables)
            .zip(&self.variables)
        {
            match variable.motion {
                Motion::Slide => assert!(holds(span.length, value), "{seed}: {span:?}"),
                Motion::Turn => {
                    assert!(holds_angle(span.arc, value), "{seed}: {value} {span:?}");
                    assert!(holds(span.cosine, value.cos()), "{seed}: {value} {span:?}");
                    assert!(holds(span.sine, value.sin()), "{seed}: {value} {span:?}");
                }
            }
        }
    }

    /// A feature in the base frame, and whether it is a point.
    fn feature(&self, feature: Feature, axes: &[Vector3<f64>]) -> (Vector3<f64>, bool) {
        let origin = |at: usize| (self.after[at].translation.vector, true);
        match feature {
            Feature::Axis(j) => (self.after[j as usize].rotation * Vector3::z(), false),
            Feature::Origin(j) => origin(j as usize),
            Feature::TipAxis(k) => (axes[k as usize], false),
            Feature::TipOrigin => origin(self.after.len() - 1),
        }
    }

    fn assert_views(&self, network: &Network, axes: &[Vector3<f64>], seed: u64) {
        let last = self.after.len() - 1;
        for (f, &feature) in network.features().iter().enumerate() {
            let (at, point) = self.feature(feature, axes);
            for i in 0..=last {
                let (before, after) = network.view(f, i);
                let views = [
                    (&self.before, before, i > 0),
                    (&self.after, after, i < last),
                ];
                for (frames, bounds, used) in views {
                    let away = if point {
                        at - frames[i].translation.vector
                    } else {
                        at
                    };
                    let seen = frames[i].rotation.inverse() * away;
                    for k in 0..3 {
                        assert!(
                            !used || holds(bounds[k], seen[k]),
                            "{seed}: {feature:?} from {i}: {seen} {bounds:?}"
                        );
                    }
                }
            }
        }
    }

    /// Where the truth is in the unknowns of the rows.
    fn unknowns(&self, spans: &Spans) -> Vec<f64> {
        let value = |(v, span): (usize, &JointSpan)| {
            let value = self.variables[v];
            match self.machine.variables[v].motion {
                Motion::Turn => {
                    let m = span.arc.middle();
                    (value - f64::from(m.y).atan2(f64::from(m.x))).sin() * UNITS
                }
                Motion::Slide => {
                    let (lo, hi) = (i64::from(span.length.lo), i64::from(span.length.hi));
                    value * UNITS - ((lo + hi) >> 1) as f64
                }
            }
        };
        spans.iter().enumerate().map(value).collect()
    }

    /// Every coordinate of every feature meets its linear form with equality.
    fn assert_rows(&self, network: &Network, spans: &Spans, axes: &[Vector3<f64>], seed: u64) {
        let expansion = Expansion::new(network, spans);
        let unknowns = self.unknowns(spans);
        for (range, x) in expansion.boxes().iter().zip(&unknowns) {
            let [lo, hi] = [range.lower, range.upper].map(|b| b.expect("bounded") as f64);
            assert!(lo <= x + 1e-3 && x - 1e-3 <= hi, "{seed}: {x} {range:?}");
        }
        for (f, &feature) in network.features().iter().enumerate() {
            let views: Vec<_> = (1..=network.moved_by(f))
                .map(|i| network.view(f, i).1)
                .collect();
            if views.is_empty() {
                continue;
            }
            let (at, point) = self.feature(feature, axes);
            let forms = expansion.forms(&network.chain(), &views, point);
            for (form, at) in forms.iter().zip(at.iter()) {
                let value = Some((at * UNITS).round() as i64);
                let linear = form.between(value, value);
                let row = linear.row();
                let sum: f64 = row
                    .terms
                    .iter()
                    .map(|t| f64::from(t.coefficient) * unknowns[usize::from(t.unknown)])
                    .sum();
                let above = row.range.lower.is_none_or(|lo| lo as f64 <= sum + UNITS);
                let below = row.range.upper.is_none_or(|hi| sum - UNITS <= hi as f64);
                assert!(above && below, "{seed}: {feature:?} {sum} {:?}", row.range);
            }
        }
    }
}

#[test]
fn boxes_and_rows_hold_the_truth() {
    for seed in 0..4000 {
        let mut random = ChaCha8Rng::seed_from_u64(seed);
        let planted = Planted::draw(&mut random);
        let (target, axes) = planted.target(&mut random);
        let chain = planted.machine.chain();
        let goal = Goal::new(&target);
        let options = Options::default();
        let mut cells = vec![Cell::ANYTHING; cells_for(chain.joints.len())];
        let mut network = Network::new(chain, &goal, options.rules, &mut cells);
        let mut spans = limits(chain);
        assert!(network.propagate(&mut spans).is_ok(), "{seed}: refused");
        planted.assert_spans(&spans, seed);
        planted.assert_views(&network, &axes, seed);
        planted.assert_rows(&network, &spans, &axes, seed);
        let relaxed = relax(&network, &mut spans, &mut NodeSimplex::new(), 200);
        assert!(relaxed.is_err(), "{seed}: refused by rows");
        planted.assert_spans(&spans, seed);
    }
}

/// Spans may be wider than the limits: the middle of a sliding follower then lies far outside the
/// reach, and neither boxes nor rows may lose the truth.
#[test]
fn spans_beyond_the_limits_hold_the_truth() {
    let mut widened = 0;
    for seed in 0..4000 {
        let mut random = ChaCha8Rng::seed_from_u64(seed);
        let planted = Planted::draw(&mut random);
        let (target, axes) = planted.target(&mut random);
        let chain = planted.machine.chain();
        let goal = Goal::new(&target);
        let mut cells = vec![Cell::ANYTHING; cells_for(chain.joints.len())];
        let rules = Options::default().rules;
        let mut network = Network::new(chain, &goal, rules, &mut cells);
        let mut spans = limits(chain);
        for (span, variable) in spans.iter_mut().zip(chain.variables) {
            if variable.motion == Motion::Slide {
                span.length.lo = random.random_range(-ONE..=span.length.lo);
                span.length.hi = random.random_range(span.length.hi..=ONE);
                widened += 1;
            }
        }
        assert!(network.propagate(&mut spans).is_ok(), "{seed}: refused");
        planted.assert_spans(&spans, seed);
        planted.assert_views(&network, &axes, seed);
        planted.assert_rows(&network, &spans, &axes, seed);
        let relaxed = relax(&network, &mut spans, &mut NodeSimplex::new(), 200);
        assert!(relaxed.is_err(), "{seed}: refused by rows");
        planted.assert_spans(&spans, seed);
    }
    assert!(widened > 1000, "{widened}");
}

/// Whatever a fieldbus delivers is answered; an orientation that is none is not refused.
#[test]
fn any_bits_for_a_target() {
    const EDGES: [i32; 9] = [i32::MIN, i32::MAX, 0, 1, -1, ONE, -ONE, ONE + 1, ONE / 2];
    let mut random = ChaCha8Rng::seed_from_u64(11);
    let mut workspace = Box::new(Workspace8::new());
    let options = Options {
        splits: 4,
        ..Options::default()
    };
    for _ in 0..4000 {
        let planted = Planted::draw(&mut random);
        let mut bits = || {
            if random.random() {
                pick(&mut random, &EDGES)
            } else {
                random.random()
            }
        };
        let (quaternion, half_sine) = ([(); 4].map(|()| bits()), bits());
        let cones = (0..3).map(|_| Cone {
            tip: [(); 3].map(|()| bits()),
            base: [(); 3].map(|()| bits()),
            half_sine: bits(),
        });
        let cones = Orientation::Axes(cones.collect());
        let garbled = [(); 3].map(|()| Interval {
            lo: bits(),
            hi: bits(),
        });
        let near = Orientation::Near {
            quaternion,
            half_sine,
        };
        let anywhere = [Interval::UNIT; 3];
        for (position, orientation) in [(anywhere, &near), (garbled, &near), (garbled, &cones)] {
            let target = Target {
                position,
                orientation: orientation.clone(),
            };
            let verdict = screen(&planted.machine, &target, &options, &mut workspace);
            let none = quaternion.iter().any(|q| q.unsigned_abs() > ONE as u32);
            if position == anywhere && none {
                assert!(matches!(verdict, Verdict::Passed(_)), "{quaternion:?}");
            }
        }
    }
}
