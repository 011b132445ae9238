//! Single operations of the fixed point beside exact integer arithmetic: where propagation's own
//! room of a unit or two would hide a rounding towards the inside.

use balk_core::fixed::{Arc, Direction, Interval, ONE, ONE_SQUARED, Product, root_down, root_up};
use balk_core::propagate::Goal;
use balk_core::target::{Cone, Orientation, Target};
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;

const ROUNDS: usize = 400_000;

/// A number in `[-2^bits, 2^bits]` of any size, zero and the ends among them.
fn number(random: &mut impl Rng, bits: u32) -> i64 {
    let size = 1i64 << random.random_range(0..=bits);
    match random.random_range(0..8) {
        0 => 0,
        1 => size,
        2 => -size,
        _ => random.random_range(-size..=size),
    }
}

/// An interval and a number in it.
fn interval(random: &mut impl Rng) -> (Interval, i64) {
    let mut parts = [number(random, 30), number(random, 30), number(random, 30)];
    if random.random() {
        // Narrow, where rounding shows.
        let near =
            |random: &mut _, p: i64| (p + number(random, 3)).clamp(-i64::from(ONE), i64::from(ONE));
        parts[1] = near(random, parts[0]);
        parts[2] = near(random, parts[0]);
    }
    parts.sort_unstable();
    let (lo, hi) = (parts[0] as i32, parts[2] as i32);
    (Interval { lo, hi }, parts[1])
}

/// A product and a number in it.
fn product(random: &mut impl Rng, bits: u32) -> (Product, i64) {
    let middle = number(random, bits);
    let (below, above) = (number(random, 20).abs(), number(random, 20).abs());
    let own = Product {
        lo: middle - below,
        hi: middle + above,
    };
    (own, middle)
}

/// Whether `numerator / divisor` lies in the interval, in units of one, or outside `[-1, 1]`.
fn holds_quotient(own: Interval, numerator: i128, divisor: i128) -> bool {
    let sign = divisor.signum();
    let (n, d) = ((numerator * sign) << 30, divisor * sign);
    let one = i128::from(ONE) * d;
    let (lo, hi) = (i128::from(own.lo) * d, i128::from(own.hi) * d);
    n.abs() > one || lo <= n && n <= hi
}

#[test]
fn products_and_sums() {
    let mut random = ChaCha8Rng::seed_from_u64(1);
    for _ in 0..ROUNDS {
        let ((a, x), (b, y)) = (interval(&mut random), interval(&mut random));
        let holds = |p: Product, v: i64| p.lo <= v && v <= p.hi;
        assert!(holds(a.times(b), x * y), "{a:?} times {b:?}");
        assert!(holds(a.scale(y as i32), x * y), "{a:?} times {y}");
        assert!(holds(a.square(), x * x), "square of {a:?}");
        assert!(
            holds(a.times(b).minus(b.square()), x * y - y * y),
            "{a:?} {b:?}"
        );
        let less = a.less(b);
        let difference = x - y;
        let inside = i64::from(less.lo) <= difference && difference <= i64::from(less.hi);
        assert!(
            difference.abs() > i64::from(ONE) || inside,
            "{a:?} less {b:?}"
        );
        let (p, v) = product(&mut random, 61);
        let half = p.halve();
        assert!(2 * half.lo <= v && v <= 2 * half.hi, "half of {p:?}");
        assert!(
            holds_quotient(p.round(0), v.into(), 1 << 60),
            "{p:?} rounded"
        );
    }
}

#[test]
fn quotients() {
    let mut random = ChaCha8Rng::seed_from_u64(2);
    let mut divided = 0;
    for _ in 0..ROUNDS {
        let (numerator, n) = product(&mut random, 61);
        let (divisor, d) = product(&mut random, 61);
        if let Some(own) = numerator.over(divisor) {
            assert!(
                holds_quotient(own, n.into(), d.into()),
                "{numerator:?} over {divisor:?}"
            );
            divided += 1;
        }
        let (divisor, d) = interval(&mut random);
        if let Some(own) = numerator.over_interval(divisor) {
            // Sixty fraction bits over thirty.
            let d = i128::from(d) << 30;
            assert!(
                holds_quotient(own, n.into(), d),
                "{numerator:?} over {divisor:?}"
            );
            divided += 1;
        }
    }
    assert!(divided > ROUNDS / 4, "{divided} divisions");
}

#[test]
fn roots_and_squares() {
    let mut random = ChaCha8Rng::seed_from_u64(3);
    for _ in 0..ROUNDS {
        let square = number(&mut random, 60).abs();
        let (down, up) = (i128::from(root_down(square)), i128::from(root_up(square)));
        assert!(
            down * down <= square.into() && up * up >= square.into(),
            "{square}"
        );
        // A value and a range that holds its square, often with nothing to spare.
        let (own, x) = interval(&mut random);
        let spare = |random: &mut _| {
            if Rng::random(random) {
                0
            } else {
                number(random, 60).abs()
            }
        };
        let square = Product {
            lo: (x * x - spare(&mut random)).max(-ONE_SQUARED),
            hi: (x * x)
                .saturating_add(spare(&mut random))
                .min(2 * ONE_SQUARED),
        };
        let mut left = own;
        let kept = left.meet_square(square).is_ok();
        let inside = i64::from(left.lo) <= x && x <= i64::from(left.hi);
        assert!(kept && inside, "{x} of {own:?} by {square:?} left {left:?}");
    }
}

/// A direction of any length; not nought.
fn direction(random: &mut impl Rng) -> Direction {
    loop {
        let bits = random.random_range(4..=30);
        let [x, y] = [number(random, bits), number(random, bits)].map(|v| v as i32);
        if (x, y) != (0, 0) {
            return Direction { x, y };
        }
    }
}

/// Whether the arc, narrower than half a turn, holds the ray through an exact pair.
fn holds(arc: Arc, (x, y): (i128, i128)) -> bool {
    let past = |d: Direction| i128::from(d.x) * y - i128::from(d.y) * x;
    arc.full || past(arc.lo) >= 0 && past(arc.hi) <= 0
}

fn sum(a: Direction, b: Direction) -> (i128, i128) {
    let [ax, ay, bx, by] = [a.x, a.y, b.x, b.y].map(i128::from);
    (ax * bx - ay * by, ax * by + ay * bx)
}

/// Arcs of one ray leave rounding no room but what moving the ends outward makes.
#[test]
fn arcs_of_one_ray() {
    let mut random = ChaCha8Rng::seed_from_u64(4);
    for _ in 0..ROUNDS {
        let (a, b) = (direction(&mut random), direction(&mut random));
        let ray = |d: Direction| (i128::from(d.x), i128::from(d.y));
        let (own, other) = (Arc::new(a, a).normalised(), Arc::new(b, b));
        assert!(holds(own, ray(a)), "{a:?} normalised");
        assert!(
            holds(Arc::new(a, a).plus(other), sum(a, b)),
            "{a:?} plus {b:?}"
        );
        let turn = Arc::between((a, a), (b, b), Arc::FULL).expect("two narrow arcs");
        assert!(holds(turn, sum(a, b.conjugate())), "{a:?} less {b:?}");
        assert!(
            holds(Arc::new(a, a).about(b), sum(a, b.conjugate())),
            "{a:?} about {b:?}"
        );
        // Components of the ray, exact up to doubles.
        let length = f64::from(a.x).hypot(f64::from(a.y)) / f64::from(ONE);
        for (bounds, part) in [(own.cosine(), a.x), (own.sine(), a.y)] {
            let part = f64::from(part) / length;
            let (lo, hi) = (f64::from(bounds.lo), f64::from(bounds.hi));
            assert!(lo <= part + 1e-6 && part - 1e-6 <= hi, "{a:?} {bounds:?}");
        }
    }
}

/// Every point of a box of vectors lies in the box's arc, and turning one such point into another
/// takes an angle of the arc between them.
#[test]
fn arcs_of_boxes() {
    let mut random = ChaCha8Rng::seed_from_u64(5);
    for _ in 0..ROUNDS {
        let mut any = || {
            let [(x, px), (y, py)] = [interval(&mut random), interval(&mut random)];
            let point = Direction {
                x: px as i32,
                y: py as i32,
            };
            Arc::of_box(x, y).map(|arc| (arc, point))
        };
        let (Some((to, a)), Some((from, b))) = (any(), any()) else {
            continue;
        };
        let ray = (i128::from(a.x), i128::from(a.y));
        assert!(holds(Arc::new(to.0, to.1), ray), "{a:?} in {to:?}");
        let Some(turn) = Arc::between(to, from, Arc::FULL) else {
            continue;
        };
        let wanted = sum(a, b.conjugate());
        // The part of the wide arcs that is told by cross products alone.
        assert!(
            turn.is_wide() || holds(turn, wanted),
            "{a:?} less {b:?} in {turn:?}"
        );
    }
}

/// What a prepared target says of one angle: its cosine and sine against squares of integers.
fn check_angle(half: i64, cosine: Interval, sine: Interval) {
    let (h, one) = (i128::from(half), i128::from(ONE_SQUARED));
    assert!(
        holds_quotient(cosine, one - 2 * h * h, one),
        "cosine of {half}"
    );
    // (2 h sqrt(1 - h^2))^2, 120 fraction bits, against squares of 60.
    let square = 4 * h * h * (one - h * h);
    let size = |s: i32| i128::from(s) * i128::from(s) * one;
    assert!(
        size(sine.lo) <= square && square <= size(sine.hi),
        "sine of {half}"
    );
}

/// A component `n / d` of a unit vector may grow to `cos(acos(n / d) - w)` when the vector turns by
/// at most `w`, twice the angle whose sine is `half`.
fn check_spread(n: i128, d: i128, half: i64, own: Interval) {
    let (n, d) = (
        n as f64 / d as f64,
        ((d - n) * (d + n)) as f64 / d as f64 / d as f64,
    );
    let half = half as f64 / f64::from(ONE);
    let (cosine, sine) = (
        1.0 - 2.0 * half * half,
        2.0 * half * (1.0 - half * half).sqrt(),
    );
    let across = d.max(0.0).sqrt();
    let most = if n >= cosine {
        1.0
    } else {
        n * cosine + across * sine
    };
    let least = if -n >= cosine {
        -1.0
    } else {
        n * cosine - across * sine
    };
    let units = f64::from(ONE);
    assert!(
        f64::from(own.hi) >= most * units - 1e-5,
        "{n} {half} {own:?}"
    );
    assert!(
        f64::from(own.lo) <= least * units + 1e-5,
        "{n} {half} {own:?}"
    );
}

/// Directions, cosines and sines of a prepared target beside exact ones.
#[test]
fn goals() {
    let mut random = ChaCha8Rng::seed_from_u64(6);
    let position = [Interval::UNIT; 3];
    for _ in 0..ROUNDS / 8 {
        let half = number(&mut random, 30).abs();
        let quaternion = [(); 4].map(|()| number(&mut random, 30) as i32);
        let orientation = Orientation::Near {
            quaternion,
            half_sine: half as i32,
        };
        let near = Target {
            position,
            orientation,
        };
        if let Goal::Near {
            axes,
            wanted,
            cosine,
            sine,
            ..
        } = Goal::new(&near)
        {
            check_angle(half, cosine, sine);
            let [w, x, y, z] = quaternion.map(i128::from);
            let norm = w * w + x * x + y * y + z * z;
            let columns = [
                [
                    norm - 2 * (y * y + z * z),
                    2 * (x * y + w * z),
                    2 * (x * z - w * y),
                ],
                [
                    2 * (x * y - w * z),
                    norm - 2 * (x * x + z * z),
                    2 * (y * z + w * x),
                ],
                [
                    2 * (x * z + w * y),
                    2 * (y * z - w * x),
                    norm - 2 * (x * x + y * y),
                ],
            ];
            for k in 0..9 {
                let (i, j) = (k / 3, k % 3);
                assert!(
                    holds_quotient(wanted[i][j], columns[i][j], norm),
                    "{quaternion:?}"
                );
                check_spread(columns[i][j], norm, half, axes[i][j]);
            }
        }
        // A direction stands for every unit vector within two units of it.
        let vector = [(); 3].map(|()| number(&mut random, 30) as i32);
        let cone = Cone {
            tip: vector,
            base: vector,
            half_sine: half as i32,
        };
        let cones = Target {
            position,
            orientation: Orientation::Axes([cone].into_iter().collect()),
        };
        let Goal::Axes { cones, .. } = Goal::new(&cones) else {
            panic!("cones stay cones");
        };
        check_angle(half, cones[0].cosine, cones[0].sine);
        for k in 0..3 {
            for off in [-2, 0, 2] {
                let one = i64::from(ONE);
                let v = (i64::from(vector[k]) + off).clamp(-one, one);
                for own in [cones[0].in_tip[k], cones[0].wanted[k]] {
                    assert!(
                        i64::from(own.lo) <= v && v <= i64::from(own.hi),
                        "{vector:?}"
                    );
                }
                check_spread(v.into(), one.into(), half, cones[0].in_base[k]);
            }
        }
    }
}
