//! Arcs against angles in double precision, at and near full turns.

use balk_core::fixed::{Arc, Direction, FRACTION_BITS, Interval, ONE};
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
use std::f64::consts::TAU;

const UNIT: f64 = 1.0 / (1u64 << FRACTION_BITS) as f64;

fn direction(angle: f64) -> Direction {
    let (sine, cosine) = angle.sin_cos();
    let units = |x: f64| (x * f64::from(ONE)).round() as i32;
    Direction {
        x: units(cosine),
        y: units(sine),
    }
}

fn angle(d: Direction) -> f64 {
    f64::from(d.y).atan2(f64::from(d.x))
}

/// Counter-clockwise way from the first end to the last.
fn width(arc: Arc) -> f64 {
    if arc.full {
        TAU
    } else {
        (angle(arc.hi) - angle(arc.lo)).rem_euclid(TAU)
    }
}

/// Whether the arc holds the angle, give or take a double's rounding.
fn holds(arc: Arc, at: f64) -> bool {
    const ROUNDING: f64 = 1e-14;
    arc.full || (at - angle(arc.lo) + ROUNDING).rem_euclid(TAU) <= width(arc) + 2.0 * ROUNDING
}

fn encloses(bounds: Interval, value: f64) -> bool {
    let units = value * f64::from(ONE);
    f64::from(bounds.lo) <= units + 1e-6 && units - 1e-6 <= f64::from(bounds.hi)
}

/// An arc of about that width anywhere.
fn arc(random: &mut impl Rng, width: f64) -> Arc {
    let start = random.random::<f64>() * TAU;
    Arc::new(direction(start), direction(start + width))
}

/// Two arcs whose widths leave so little of a full turn that moving the ends of their sum outward
/// would make them pass each other.
#[test]
fn sums_that_almost_close_a_turn() {
    let mut random = ChaCha8Rng::seed_from_u64(1);
    for _ in 0..200_000 {
        let gap = random.random_range(0.0..300.0) * UNIT;
        let first = random.random::<f64>() * (TAU - gap);
        let (a, b) = (arc(&mut random, first), arc(&mut random, TAU - gap - first));
        let both = width(a) + width(b);
        let sum = a.plus(b);
        assert!(sum.full || both >= TAU || width(sum) >= both, "{a:?} {b:?}");
    }
}

#[test]
fn arcs_that_are_almost_a_turn_seen_from_their_middle() {
    let mut random = ChaCha8Rng::seed_from_u64(2);
    for _ in 0..200_000 {
        let gap = random.random_range(2.0..300.0) * UNIT;
        let arc = arc(&mut random, TAU - gap);
        let about = arc.about(arc.middle());
        assert!(about.full || width(about) >= width(arc), "{arc:?}");
    }
}

/// The ends are the angles that rounding loses first.
#[test]
fn sums_hold_the_sums_of_their_ends() {
    let mut random = ChaCha8Rng::seed_from_u64(3);
    for _ in 0..200_000 {
        let mut any = || {
            let size = 10f64.powi(random.random_range(-9..1));
            let width = random.random::<f64>() * 3.0 * size;
            arc(&mut random, width)
        };
        let (a, b) = (any(), any());
        let sum = a.plus(b);
        for (one, other) in [(a.lo, b.lo), (a.hi, b.hi), (a.lo, b.hi), (a.hi, b.lo)] {
            let at = angle(one) + angle(other);
            assert!(holds(sum, at), "{a:?} {b:?} {sum:?}");
            assert!(encloses(sum.cosine(), at.cos()), "{a:?} {b:?}");
            assert!(encloses(sum.sine(), at.sin()), "{a:?} {b:?}");
        }
    }
}

/// What one arc and another both hold, their intersection holds; where they share nothing there
/// is no common end.
#[test]
fn intersections_keep_what_both_hold() {
    let mut random = ChaCha8Rng::seed_from_u64(4);
    for _ in 0..200_000 {
        let mut any = || {
            let width = match random.random_range(0..4) {
                0 => 0.0,
                1 => TAU / 2.0,
                2 => TAU - random.random_range(2.0..300.0) * UNIT,
                _ => random.random::<f64>() * (TAU - 1e-6),
            };
            arc(&mut random, width)
        };
        let (a, mut b) = (any(), any());
        match random.random_range(0..4) {
            0 => b.lo = a.hi,
            1 => b.hi = a.lo,
            2 => b.lo = a.lo,
            _ => {}
        }
        let common: Vec<Direction> = [a.lo, a.hi, b.lo, b.hi, a.middle(), b.middle()]
            .into_iter()
            .filter(|&d| a.contains(d) && b.contains(d))
            .collect();
        let mut both = a;
        match both.meet(b) {
            Ok(_) => assert!(common.iter().all(|&d| both.contains(d)), "{a:?} {b:?}"),
            Err(_) => assert!(common.is_empty(), "{a:?} {b:?}"),
        }
    }
}

/// Every end and the middle lie in one of the halves, down to arcs of no width and up to a turn.
#[test]
fn halves_cover_the_arc() {
    let mut random = ChaCha8Rng::seed_from_u64(5);
    for _ in 0..100_000 {
        let width = match random.random_range(0..4) {
            0 => random.random_range(0.0..20.0) * UNIT,
            1 => TAU / 2.0 + random.random_range(-20.0..20.0) * UNIT,
            2 => TAU - random.random_range(2.0..300.0) * UNIT,
            _ => random.random::<f64>() * (TAU - 1e-6),
        };
        let arc = arc(&mut random, width);
        let (lower, upper) = arc.halves();
        let start = angle(arc.lo);
        for k in 0..=64 {
            let d = direction(start + width * f64::from(k) / 64.0);
            let inside = arc.contains(d);
            assert!(!inside || lower.contains(d) || upper.contains(d), "{arc:?}");
        }
    }
}
