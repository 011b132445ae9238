//! Lifted rows: published gaps of the estimators, and every row holds at every true posture.

use balk::model::{Cone, Machine, Orientation, Target};
use balk::pack::{Pack, pack, pack_target};
use balk_core::fixed::{Arc, Direction, Interval, ONE, ONE_SQUARED};
use balk_core::machine::{Motion, Placement};
use balk_core::propagate::cell::{Cell, JointSpan};
use balk_core::propagate::{Chain, Feature, Goal, Network, Rules, Spans};
use balk_core::screen::{cells_for, limits};
use nalgebra::{Matrix3, Rotation3, Unit, Vector3};
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;

use balk_tests::measure::lifted::envelope::{
    Plane, chord, product, secant, sphere_tangent, tangent,
};
use balk_tests::measure::lifted::form::Form;
use balk_tests::measure::lifted::hull;
use balk_tests::measure::lifted::program::Families;
use balk_tests::measure::lifted::relations::violated;
use balk_tests::measure::lifted::unknowns::Lifted;

fn interval(lo: f64, hi: f64) -> Interval {
    Interval {
        lo: fixed(lo),
        hi: fixed(hi),
    }
}

fn fixed(value: f64) -> i32 {
    (value * ONE as f64).round() as i32
}

fn float(square: i64) -> f64 {
    square as f64 / ONE_SQUARED as f64
}

/// McCormick, *Computability of global solutions to factorable nonconvex programs: Part I*, Math.
/// Program. 10, 1976, 147-175: the four facets, each exact at two corners and never on the wrong side.
#[test]
fn envelope_of_a_product_is_mccormicks() {
    let mut rng = ChaCha8Rng::seed_from_u64(1);
    for _ in 0..20_000 {
        let [a, b, c, d]: [i32; 4] = [(); 4].map(|()| rng.random_range(-ONE..=ONE));
        let x = Interval {
            lo: a.min(b),
            hi: a.max(b),
        };
        let y = Interval {
            lo: c.min(d),
            hi: c.max(d),
        };
        let (at_x, at_y) = (rng.random_range(x.lo..=x.hi), rng.random_range(y.lo..=y.hi));
        let (own_x, own_y) = (rng.random_range(x.lo..=x.hi), rng.random_range(y.lo..=y.hi));
        let true_product = own_x as i64 * own_y as i64;
        let below = product(x, y, (at_x, at_y), false);
        let above = product(x, y, (at_x, at_y), true);
        assert!(below.at(own_x, own_y) <= true_product && true_product <= above.at(own_x, own_y));
        let corners = |(p, q): (i32, i32), (r, s): (i32, i32), plane: Plane| {
            plane.at(p, q) == p as i64 * q as i64 && plane.at(r, s) == r as i64 * s as i64
        };
        assert!(corners((x.lo, y.hi), (x.hi, y.lo), below));
        assert!(corners((x.lo, y.lo), (x.hi, y.hi), above));
        assert!(
            corners((x.lo, y.lo), (x.lo, y.lo), below)
                || corners((x.hi, y.hi), (x.hi, y.hi), below)
        );
        // The facet at hand is the tighter of the two at the point asked about.
        let other = |plane: &dyn Fn(i64, i64) -> i64| plane(at_x as i64, at_y as i64);
        let low = other(&|u, v| {
            let facet = |p: i32, q: i32| q as i64 * u + p as i64 * v - p as i64 * q as i64;
            facet(x.lo, y.lo).max(facet(x.hi, y.hi))
        });
        let high = other(&|u, v| {
            let facet = |p: i32, q: i32| q as i64 * u + p as i64 * v - p as i64 * q as i64;
            facet(x.hi, y.lo).min(facet(x.lo, y.hi))
        });
        assert_eq!(below.at(at_x, at_y), low);
        assert_eq!(above.at(at_x, at_y), high);
    }
}

/// The largest gap is a quarter of the product of the widths, at the midpoint (computed from
/// McCormick 1976): box [-1, 2] x [-3, 5] has gap 6 at (0.5, 1) and envelope [-5.5, 6.5]; box
/// [-1, 1]^2 has gap 1, and 1 / n^2 after n equal parts an axis; the envelope over [0, 1]^2 has
/// volume 1/6.
#[test]
fn gap_of_the_envelope() {
    // An eighth of the box, so that it fits.
    let (x, y) = (interval(-0.125, 0.25), interval(-0.375, 0.625));
    let at = (fixed(0.0625), fixed(0.125));
    let below = float(product(x, y, at, false).at(at.0, at.1)) * 64.0;
    let above = float(product(x, y, at, true).at(at.0, at.1)) * 64.0;
    assert_eq!((below, above), (-5.5, 6.5));
    let gap = |x: Interval, y: Interval, at: (i32, i32)| {
        let exact = float(at.0 as i64 * at.1 as i64);
        (exact - float(product(x, y, at, false).at(at.0, at.1)))
            .max(float(product(x, y, at, true).at(at.0, at.1)) - exact)
    };
    let mut worst: f64 = 0.0;
    for i in 0..=64 {
        for j in 0..=64 {
            let at = |range: Interval, k: i64| (range.lo as i64 + range.width() * k / 64) as i32;
            worst = worst.max(gap(x, y, (at(x, i), at(y, j))));
        }
    }
    assert_eq!(worst * 64.0, 6.0);
    for n in [1, 2, 4, 8, 16] {
        let part = interval(-1.0, -1.0 + 2.0 / n as f64);
        let middle = fixed(-1.0 + 1.0 / n as f64);
        assert_eq!(gap(part, part, (middle, middle)), 1.0 / (n * n) as f64);
    }
    let unit = interval(0.0, 1.0);
    let n = 256;
    let volume: f64 = (0..n * n)
        .map(|k| {
            let at = [k / n, k % n].map(|i| fixed((i as f64 + 0.5) / n as f64));
            let side = |above| float(product(unit, unit, (at[0], at[1]), above).at(at[0], at[1]));
            side(true) - side(false)
        })
        .sum::<f64>()
        / (n * n) as f64;
    assert!((volume - 1.0 / 6.0).abs() < 1e-5, "{volume}");
}

/// Secant and end tangents of the square on width D miss it by at most D^2 / 4, at the midpoint
/// (standard; computed): on [-1, 1] in n = 1, 2, 4, 8, 16 parts 1, 0.25, 0.0625, 0.015625,
/// 0.00390625.
#[test]
fn gap_of_a_square() {
    for (n, expected) in [
        (1, 1.0),
        (2, 0.25),
        (4, 0.0625),
        (8, 0.015625),
        (16, 0.00390625),
    ] {
        let x = interval(-1.0, -1.0 + 2.0 / n as f64);
        let mut gaps = [0f64; 2];
        for k in 0..=64 {
            let at = (x.lo as i64 + x.width() * k / 64) as i32;
            let exact = at as i64 * at as i64;
            let above = secant(x).at(at) - exact;
            let below = exact - tangent(x.lo).at(at).max(tangent(x.hi).at(at));
            assert!(above >= 0 && below >= 0);
            gaps = [gaps[0].max(float(above)), gaps[1].max(float(below))];
        }
        assert_eq!(gaps, [expected; 2]);
    }
}

/// A circle between N chords and N tangents (standard; computed): inner error 1 - cos(pi / N), outer
/// sec(pi / N) - 1. An arc of width h has sagitta 1 - cos(h / 2).
#[test]
fn chords_and_tangents_of_the_circle() {
    let published = [
        (4, 0.292893219, 0.414213562),
        (8, 0.076120467, 0.082392200),
        (16, 0.019214720, 0.019591158),
        (24, 0.008555139, 0.008628961),
        (32, 0.004815273, 0.004838572),
        (64, 0.001204544, 0.001205996),
    ];
    for (n, inner, outer) in published {
        let half = std::f64::consts::PI / f64::from(n);
        let (middle, least) = chord(arc_about(0.4, half)).expect("not every angle");
        let size = f64::from(middle.x).hypot(f64::from(middle.y)) / f64::from(ONE);
        assert!((1.0 - float(least) / size - inner).abs() < 2e-8, "{n}");
        // The corner of the tangents at both ends of the arc, halved so that it fits.
        let corner = |excess: f64| {
            let radius = (1.0 + outer + excess) / 2.0;
            let corner = [0.4f64.cos() * radius, 0.4f64.sin() * radius];
            [0.4 - half, 0.4 + half].iter().all(|angle| {
                let end = [fixed(angle.cos()), fixed(angle.sin())];
                let along = f64::from(end[0]) * corner[0] + f64::from(end[1]) * corner[1];
                2.0 * along / f64::from(ONE) <= float(sphere_tangent(&end))
            })
        };
        assert!(corner(-3e-8) && !corner(3e-8), "{n}");
    }
}

/// The chord row holds on the whole arc, whatever its width.
#[test]
fn chord_holds_on_the_arc() {
    let mut rng = ChaCha8Rng::seed_from_u64(4);
    for round in 0..4000 {
        // Every other one is near half a turn, where the middle is not the bisector.
        let half = match round % 2 {
            0 => rng.random_range(1e-6..3.1),
            _ => std::f64::consts::FRAC_PI_2 + rng.random_range(-0.05..0.05),
        };
        let middle = rng.random_range(-3.0..3.0);
        let (along, least) = chord(arc_about(middle, half)).expect("not every angle");
        for part in [-1.0, -0.6, 0.0, 0.3, 1.0] {
            let angle: f64 = middle + half * part;
            let value = f64::from(along.x) * angle.cos() + f64::from(along.y) * angle.sin();
            assert!(
                value / f64::from(ONE) >= float(least),
                "{middle} {half} {part}"
            );
        }
    }
    assert!(chord(Arc::FULL).is_none());
}

fn direction(angle: f64) -> Direction {
    Direction {
        x: fixed(angle.cos()),
        y: fixed(angle.sin()),
    }
}

fn arc_about(middle: f64, half: f64) -> Arc {
    Arc::new(direction(middle - half), direction(middle + half))
}

/// A row made of factors that are only known to within an interval holds for every such factor.
#[test]
fn rows_cover_uncertain_factors() {
    let mut rng = ChaCha8Rng::seed_from_u64(5);
    for _ in 0..4000 {
        let mut form = Form::default();
        let mut point = [0i32; 3];
        let mut exact = 0f64;
        for (unknown, value) in point.iter_mut().enumerate() {
            *value = rng.random_range(-ONE..=ONE);
            let lo = rng.random_range(-ONE..=ONE / 2);
            let factor = Interval {
                lo,
                hi: lo + rng.random_range(0..1 << 24),
            };
            form.add_between(&Form::unknown(unknown), factor);
            let chosen = [factor.lo, factor.hi][rng.random_range(0..2)];
            exact += f64::from(chosen) * f64::from(*value);
        }
        // What is known of the sum is that it has this value, to a rounding of the double.
        let known = exact as i64;
        let row = form
            .between(Some(known - 1024), Some(known + 1024))
            .expect("has terms");
        assert!(row.violation(&point) <= 0);
    }
}

/// Saunderson, Parrilo and Willsky, *Semidefinite descriptions of the convex hull of rotation
/// matrices*, SIAM J. Optim. 25(3), 2015, 1314-1343: a matrix is in the hull exactly when the trace
/// of its product with every rotation's transpose is at least -1.
#[test]
fn hull_cut_holds_for_rotations_and_finds_what_is_outside() {
    let mut rng = ChaCha8Rng::seed_from_u64(2);
    let cut = |matrix: &Matrix3<f64>| {
        let rows = [0, 1, 2].map(|i| [0, 1, 2].map(|j| matrix[(i, j)] as f32));
        let (norm, rotation) = hull::rotation(hull::worst(&rows));
        let rotation = Matrix3::from_fn(|i, j| f64::from(rotation[i][j]) / f64::from(norm));
        assert!((rotation * rotation.transpose() - Matrix3::identity()).norm() < 1e-12);
        assert!((rotation.determinant() - 1.0).abs() < 1e-12);
        1.0 + (rotation.transpose() * matrix).trace()
    };
    let mut outside = 0;
    for _ in 0..5000 {
        let turn = *random_rotation(&mut rng).matrix();
        assert!(cut(&turn) > -1e-9);
        // The centre of two rotations is in the hull, a mirror image is not.
        let other = *random_rotation(&mut rng).matrix();
        assert!(cut(&((turn + other) / 2.0)) > -1e-9);
        assert!(cut(&-turn) < -1.9);
        // The least trace over all rotations, from the singular values: for -R the largest is the sum
        // with the least one negative when the determinant of -R is.
        let any = Matrix3::from_fn(|_, _| rng.random_range(-1.0..1.0));
        let mut values: Vec<f64> = any.singular_values().iter().copied().collect();
        values.sort_by(f64::total_cmp);
        let least = 1.0 - values[2] - values[1] + values[0] * f64::signum(any.determinant());
        if least < -0.01 {
            outside += 1;
            let found = cut(&any);
            assert!(
                found >= least - 1e-6 && found < 0.9 * least,
                "{found} {least}"
            );
        }
    }
    assert!(outside > 1000);
}

fn random_rotation(rng: &mut ChaCha8Rng) -> Rotation3<f64> {
    let axis = loop {
        let v = Vector3::from_fn(|_, _| rng.random_range(-1.0..1.0f64));
        if v.norm() > 0.1 && v.norm() < 1.0 {
            break Unit::new_normalize(v);
        }
    };
    Rotation3::from_axis_angle(&axis, rng.random_range(-3.1..3.1))
}

const MACHINES: [&str; 3] = ["spherical", "offset", "seven"];

fn arm(name: &str) -> (Machine, Pack) {
    let file = format!("{}/machines/{name}.toml", env!("CARGO_MANIFEST_DIR"));
    let machine = balk::read::machine(&std::fs::read(&file).unwrap(), &file).unwrap();
    let packed = pack(&machine, 0).unwrap();
    (machine, packed)
}

fn chain(packed: &Pack) -> Chain<'_> {
    Chain {
        joints: &packed.machine.joints,
        variables: &packed.machine.variables,
        tip: &packed.machine.tip,
    }
}

/// A placement of the packed chain in double precision: rotation and origin.
fn place(placement: &Placement) -> (Matrix3<f64>, Vector3<f64>) {
    let unit = f64::from(ONE);
    (
        Matrix3::from_fn(|i, j| f64::from(placement.rotation[i][j]) / unit),
        Vector3::from_fn(|k, _| {
            let o = placement.origin[k];
            (f64::from(o.lo) + f64::from(o.hi)) / 2.0 / unit
        }),
    )
}

/// Every frame of the packed chain in the base: the base, after each joint, the tip.
fn frames(packed: &Pack, variables: &[f64]) -> Vec<(Matrix3<f64>, Vector3<f64>)> {
    let mut at = (Matrix3::identity(), Vector3::zeros());
    let mut frames = vec![at];
    for joint in &packed.machine.joints {
        assert!(joint.motion == Motion::Turn && joint.is_plain());
        let (rotation, origin) = place(&joint.placement);
        let turn =
            Rotation3::from_axis_angle(&Vector3::z_axis(), variables[joint.variable as usize]);
        at = (at.0 * rotation * turn.matrix(), at.1 + at.0 * origin);
        frames.push(at);
    }
    let (rotation, origin) = place(&packed.machine.tip);
    frames.push((at.0 * rotation, at.1 + at.0 * origin));
    frames
}

/// The true value of every unknown, in units of one.
fn truth(
    network: &Network,
    lifted: &Lifted,
    packed: &Pack,
    variables: &[f64],
    cone: &Vector3<f64>,
    near: bool,
) -> Vec<f64> {
    let frames = frames(packed, variables);
    let count = packed.machine.joints.len();
    let tip = frames[count + 1];
    let mut values = Vec::new();
    for joint in &packed.machine.joints {
        let angle = variables[joint.variable as usize];
        values.extend([angle.cos(), angle.sin()]);
    }
    for &f in lifted.features() {
        let feature = network.features()[f];
        let in_base = match feature {
            Feature::TipOrigin => tip.1,
            Feature::TipAxis(k) if near => tip.0.column(k as usize).into(),
            Feature::TipAxis(_) => tip.0 * cone,
            Feature::Origin(j) => frames[j as usize].1,
            Feature::Axis(j) => frames[j as usize].0.column(2).into(),
        };
        for frame in &frames[..=count] {
            let relative = if feature.is_point() {
                in_base - frame.1
            } else {
                in_base
            };
            values.extend((frame.0.transpose() * relative).iter());
        }
    }
    values
}

/// A random sub-arc of the spans that holds the angles.
fn shrink(spans: &mut Spans, variables: &[f64], width: f64, rng: &mut ChaCha8Rng) {
    for (span, &angle) in spans.iter_mut().zip(variables) {
        let [below, above] = [(); 2].map(|()| width * rng.random_range(1e-6..1.0));
        if below + above > 6.0 {
            continue;
        }
        let own = Arc::new(direction(angle - below), direction(angle + above));
        let mut arc = span.arc;
        arc.meet(own).expect("both hold the angle");
        *span = JointSpan::of_arc(arc);
    }
}

/// At planted postures of the three arms, within every kind of target and random parts of the joint
/// space, no row that any point of the boxes calls for is missed by the true posture.
///
/// The truth is computed in double precision from the packed chain, whose rounded rotations are
/// orthonormal to 2^-29: rows may be missed by 64 units of 2^-30 times their size, a few thousandths of
/// what makes a row worth taking (2^-18).
#[test]
fn rows_hold_at_true_postures() {
    let mut rng = ChaCha8Rng::seed_from_u64(3);
    let names = [
        ("linear", Families::LINEAR),
        ("rotation", Families::ROTATION),
        ("dot and cross", Families::DOT_CROSS),
        ("squares", Families::SQUARES),
        ("arcs", Families::ARCS),
        ("closing", Families::CLOSING),
        ("orthogonal", Families::ORTHOGONAL),
        ("hull", Families::HULL),
    ];
    let mut counts = [0usize; 8];
    for name in MACHINES {
        let (machine, packed) = arm(name);
        let count = packed.machine.joints.len();
        for round in 0..72 {
            let joints: Vec<f64> = machine
                .joints
                .iter()
                .map(|j| {
                    let [lo, hi] = j.limits.unwrap();
                    if rng.random_bool(0.2) {
                        [lo, hi][round % 2]
                    } else {
                        rng.random_range(lo..hi)
                    }
                })
                .collect();
            let variables: Vec<f64> = packed
                .drives
                .iter()
                .map(|d| (joints[d.joint] - d.offset) / d.multiple)
                .collect();
            let pose = balk::kinematics::tip_pose(&machine, &joints, 0);
            let within = [1e-3, 0.05, 0.3][round % 3];
            let turn = [0.01, 0.35, 2.0][round % 3];
            let cone = Unit::new_normalize(Vector3::new(0.3, -0.2, 0.9));
            let rotation = pose.rotation.to_rotation_matrix();
            let near = round % 4 < 2;
            let orientation = match round % 4 {
                0 | 1 => Orientation::Near {
                    rotation: Rotation3::from_axis_angle(&Vector3::y_axis(), 0.9 * turn) * rotation,
                    within: turn,
                },
                2 => Orientation::Free,
                _ => Orientation::Axes(vec![Cone {
                    tip: cone,
                    base: Unit::new_normalize(rotation * *cone),
                    within: turn,
                }]),
            };
            let target = Target {
                id: String::new(),
                tip: 0,
                xyz: pose.translation.vector + Vector3::new(0.9, -0.9, 0.5) * within,
                xyz_within: Vector3::repeat(within),
                orientation,
            };
            let goal = Goal::new(&pack_target(&target, packed.scale));
            let mut cells = vec![Cell::ANYTHING; cells_for(count)];
            let mut network = Network::new(chain(&packed), &goal, Rules::ALL, &mut cells);
            let mut spans = limits(chain(&packed));
            shrink(
                &mut spans,
                &variables,
                [7.0, 1.0, 0.1][round / 3 % 3],
                &mut rng,
            );
            network.propagate(&mut spans).expect("holds a posture");
            let lifted = Lifted::new(&network, Families::ALL, 600);
            assert_eq!(lifted.features().len(), network.features().len());
            let truth = truth(&network, &lifted, &packed, &variables, &cone, near);
            let boxes: Vec<_> = lifted.boxes().collect();
            assert_eq!(boxes.len(), lifted.unknowns());
            for (unknown, (range, value)) in boxes.iter().zip(&truth).enumerate() {
                let value = value * f64::from(ONE);
                assert!(
                    range.lower.unwrap() as f64 - 8.0 < value
                        && value < range.upper.unwrap() as f64 + 8.0,
                    "{name} {round}: unknown {unknown} {value} {range:?}"
                );
            }
            for _ in 0..10 {
                let point: Vec<i32> = boxes
                    .iter()
                    .map(|b| rng.random_range(b.lower.unwrap()..=b.upper.unwrap()) as i32)
                    .collect();
                for ((label, family), count) in names.iter().zip(&mut counts) {
                    for row in violated(&lifted, &point, *family).rows() {
                        *count += 1;
                        let row = row.row();
                        let value: f64 = row
                            .terms
                            .iter()
                            .map(|t| f64::from(t.coefficient) * truth[t.unknown as usize])
                            .sum::<f64>()
                            * f64::from(ONE);
                        let slack = 64.0 * f64::from(ONE);
                        assert!(
                            row.range.lower.is_none_or(|l| value > l as f64 - slack)
                                && row.range.upper.is_none_or(|u| value < u as f64 + slack),
                            "{name} {round} {label}: {value} not in {:?}",
                            row.range
                        );
                    }
                }
            }
        }
    }
    println!("rows checked: {counts:?}");
    assert!(counts.iter().all(|&count| count > 500), "{counts:?}");
}
