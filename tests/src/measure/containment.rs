//! Containment: after every step of a node test, every box still holds the truth.
//!
//! A posture is planted on a random machine built within its tolerances, a target is drawn that
//! the posture meets, and the node test runs on the full limits, on spans cut around the posture
//! and on the halves that hold it. Then every box of every feature seen from every joint, every
//! span, every squared length and every first-order row is compared with the double-precision
//! value of [`crate::truth`].

use crate::families::Family as Arm;
use crate::random::{Sample, build, posture, target};
use crate::truth::{Frames, Truth};
use balk::kinematics::joint_values;
use balk::model::{Kind, Orientation, Target, Tolerance};
use balk::pack::{Pack, pack, pack_target, range};
use balk_core::fixed::{Arc, Direction, Interval, ONE};
use balk_core::machine::Motion;
use balk_core::propagate::cell::{Cell, JointSpan, Vector};
use balk_core::propagate::{Branch, Goal, Network, Rules, Spans};
use balk_core::relaxation::{NodeSimplex, relax};
use balk_core::rows::{Expansion, Form};
use balk_core::screen::{cells_for, limits};
use indicatif::ProgressBar;
use nalgebra::Vector3;
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rayon::prelude::*;
use std::f64::consts::{FRAC_PI_2, PI, TAU};

/// Units of the fixed point in one.
const UNITS: f64 = ONE as f64;
/// How far a truth may lie outside its box, units: what double precision leaves open (about 1e-12
/// of the reach), a thousandth of what any rounding of the core amounts to.
const ALLOWANCE: f64 = 1e-3;
/// Postures on each machine, each with a target of its own.
const POSTURES: u32 = 5;
/// Boxes of spans cut around the posture, halvings, and cuts chosen by the core.
const STEPS: [u32; 3] = [3, 4, 2];
/// Checks on each machine: those and the full limits.
pub const CHECKS_PER_MACHINE: u64 = (POSTURES * (1 + STEPS[0] + STEPS[1] + STEPS[2])) as u64;
/// Pivots of the simplex at each node.
const PIVOTS: u32 = 200;
/// One machine in so many is an arm of `machines/`.
const ARMS_EVERY: u64 = 8;

/// What is compared with the truth.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kinds {
    /// Features in the base frame.
    Base,
    /// Features seen from joints before motion.
    Before,
    /// Features seen from joints after motion.
    After,
    /// Features in the tip frame.
    Tip,
    /// Squared lengths of all of these.
    Square,
    /// Arcs, cosines, sines and lengths of variables and joints.
    Span,
    /// First-order rows and the boxes of their unknowns.
    Row,
    /// Nodes that hold a posture and must not be called empty.
    Open,
}

impl Kinds {
    const ALL: [Kinds; 8] = [
        Kinds::Base,
        Kinds::Before,
        Kinds::After,
        Kinds::Tip,
        Kinds::Square,
        Kinds::Span,
        Kinds::Row,
        Kinds::Open,
    ];

    fn name(self) -> &'static str {
        match self {
            Kinds::Base => "base frame",
            Kinds::Before => "before joints",
            Kinds::After => "after joints",
            Kinds::Tip => "tip frame",
            Kinds::Square => "squared lengths",
            Kinds::Span => "spans",
            Kinds::Row => "rows",
            Kinds::Open => "nodes kept open",
        }
    }
}

/// Comparisons of one kind.
#[derive(Clone, Copy, Debug)]
pub struct Margins {
    /// How many.
    pub compared: u64,
    /// How many had the truth outside.
    pub violations: u64,
    /// Least distance of the truth from an end of a box that is not a single value, units.
    pub least: f64,
}

/// What a run found.
#[derive(Clone, Debug)]
pub struct Tally {
    /// Machines that were packed.
    pub machines: u64,
    /// Postures on them.
    pub postures: u64,
    /// Node tests: one posture in one box of spans, with all its boxes.
    pub checks: u64,
    /// By kind of comparison, in the order of the table.
    pub margins: [Margins; 8],
    /// The first few violations: everything needed to repeat them.
    pub failures: Vec<String>,
}

impl Default for Tally {
    fn default() -> Self {
        let none = Margins {
            compared: 0,
            violations: 0,
            least: f64::INFINITY,
        };
        Tally {
            machines: 0,
            postures: 0,
            checks: 0,
            margins: [none; 8],
            failures: Vec::new(),
        }
    }
}

impl Tally {
    /// Number of boxes that lost the truth and nodes called empty.
    pub fn violations(&self) -> u64 {
        self.margins.iter().map(|m| m.violations).sum()
    }

    /// The comparisons of one kind.
    pub fn of(&self, kind: Kinds) -> &Margins {
        &self.margins[kind as usize]
    }

    fn plus(mut self, other: Tally) -> Tally {
        self.machines += other.machines;
        self.postures += other.postures;
        self.checks += other.checks;
        for (own, others) in self.margins.iter_mut().zip(other.margins) {
            own.compared += others.compared;
            own.violations += others.violations;
            own.least = own.least.min(others.least);
        }
        self.failures.extend(other.failures);
        self.failures.truncate(8);
        self
    }

    /// Counts a comparison by the truth's distance from the nearer end, units: negative outside.
    fn note(&mut self, kind: Kinds, margin: f64, single: bool, what: impl Fn() -> String) {
        let margins = &mut self.margins[kind as usize];
        margins.compared += 1;
        if !single {
            margins.least = margins.least.min(margin);
        }
        // Not a number is no proof of containment.
        if !(margin >= -ALLOWANCE) {
            margins.violations += 1;
            if self.failures.len() < 4 {
                self.failures
                    .push(format!("{}: {margin:.4} units: {}", kind.name(), what()));
            }
        }
    }

    fn interval(&mut self, kind: Kinds, own: Interval, truth: f64, what: impl Fn() -> String) {
        let truth = truth * UNITS;
        let margin = (truth - f64::from(own.lo)).min(f64::from(own.hi) - truth);
        self.note(kind, margin, own.lo == own.hi, || {
            format!("{} {truth} in {own:?}", what())
        });
    }
}

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
struct Case<'a> {
    pack: &'a Pack,
    truth: Truth,
    /// Values of the packed machine's variables: radians, or scaled lengths.
    variables: Vec<f64>,
    /// The tip axes the target speaks of, in the tip frame.
    axes: Vec<Vector3<f64>>,
    /// Where to find it again.
    name: String,
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
    fn check(
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
            tally.note(Kinds::Row, margin, lo == hi, || {
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
                self.row(&forms[k], truth[k], &deviations, tally);
                sum.add(&forms[k], weights[k] as i64, 0);
            }
            self.row(&sum, weights.dot(&truth) / UNITS, &deviations, tally);
        }
    }

    /// A form that stands for a quantity of this value (units).
    fn row(&self, form: &Form, value: f64, deviations: &[f64], tally: &mut Tally) {
        let linear = form.between(Some(value.floor() as i64), Some(value.ceil() as i64));
        let row = linear.row();
        let sum: f64 = row
            .terms
            .iter()
            .map(|t| f64::from(t.coefficient) * deviations[t.unknown as usize])
            .sum();
        let low = row.range.lower.map_or(f64::INFINITY, |l| sum - l as f64);
        let high = row.range.upper.map_or(f64::INFINITY, |h| h as f64 - sum);
        tally.note(Kinds::Row, low.min(high) / UNITS, false, || {
            format!("{}: value {value}, terms {sum}, {:?}", self.name, row.range)
        });
    }

    /// A box of spans within limits that holds the posture: some as given, some cut around it.
    fn around(&self, random: &mut impl Rng, whole: &Spans) -> Spans {
        // From two units to half a turn.
        let finest = random.random_range(-29.0..1.5);
        let mut size = || f64::exp2(random.random_range(finest..1.65f64));
        let mut spans = whole.clone();
        for (v, span) in spans.iter_mut().enumerate() {
            let (low, high) = (size(), size());
            if low > 1.5 {
                continue;
            }
            let truth = self.variables[v];
            match self.motion(v) {
                Motion::Turn if low + high < TAU - 0.01 => {
                    let near = Arc::new(direction(truth - low), direction(truth + high));
                    let mut arc = span.arc;
                    if arc.meet(near).is_ok() {
                        *span = JointSpan::of_arc(arc);
                    }
                }
                Motion::Turn => {}
                Motion::Slide => {
                    let (low, high) = ((truth - low) * UNITS, (truth + high) * UNITS);
                    let near = Interval::clamped(low.floor() as i64, high.ceil() as i64);
                    let mut length = span.length;
                    if length.meet(near).is_ok() {
                        *span = JointSpan::of_length(length);
                    }
                }
            }
        }
        spans
    }

    /// The half that holds the posture of a random span that is worth cutting.
    fn half(&self, random: &mut impl Rng, spans: &Spans, tally: &mut Tally) -> Spans {
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
    fn branch(&self, network: &mut Network, spans: &Spans, tally: &mut Tally) -> Spans {
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

fn direction(angle: f64) -> Direction {
    let (y, x) = angle.sin_cos();
    Direction {
        x: (x * UNITS).round() as i32,
        y: (y * UNITS).round() as i32,
    }
}

/// A posture whose joints often have special values or lie close to them.
fn special(random: &mut impl Rng, sample: &Sample) -> Option<Vec<f64>> {
    let mut values = posture(random, &sample.written)?;
    for (i, joint) in sample.written.joints.iter().enumerate() {
        if joint.kind != Kind::Revolute || joint.follows.is_some() || random.random() {
            continue;
        }
        let [lo, hi] = range(&sample.written, i);
        let exact = [0.0, FRAC_PI_2, -FRAC_PI_2, PI, -PI][random.random_range(0..5)];
        let near = match random.random_range(0..3) {
            0 => {
                exact + random.random_range(-1.0..1.0) * f64::exp2(random.random_range(-32.0..-4.0))
            }
            _ => exact,
        };
        if lo <= near && near <= hi {
            values[i] = near;
        }
    }
    Some(joint_values(&sample.written, &values))
}

/// Tip axes a target speaks of, in the tip frame.
fn axes(target: &Target) -> Vec<Vector3<f64>> {
    match &target.orientation {
        Orientation::Free => Vec::new(),
        Orientation::Axes(cones) => cones.iter().map(|cone| *cone.tip).collect(),
        Orientation::Near { .. } => vec![Vector3::x(), Vector3::y(), Vector3::z()],
    }
}

/// An arm, half the time with tolerances and built within them.
fn arm(random: &mut impl Rng, arm: &Arm) -> Sample {
    let mut written = arm.machine.clone();
    if random.random() {
        for joint in &mut written.joints {
            joint.tolerance = Tolerance {
                xyz: random.random_range(0.0..0.001),
                angle: random.random_range(0.0..0.001),
            };
        }
    }
    let built = build(random, &written);
    Sample { written, built }
}

/// How far the planted truth is moved before it is compared: nothing, but where the comparison
/// itself is tested.
#[derive(Clone, Copy, Debug, Default)]
pub struct Lie {
    /// Added to every joint's value, radians.
    pub values: f64,
}

/// One machine with all its postures: the same for the same seed and number.
///
/// Random draws that cannot be packed, or whose frames doubles do not determine, are drawn again.
pub fn machine(seed: u64, number: u64, arms: &[Arm], lie: Lie) -> Tally {
    let mut random = ChaCha8Rng::seed_from_u64(seed.wrapping_mul(1_000_003).wrapping_add(number));
    let mut tally = Tally::default();
    while tally.postures < POSTURES.into() {
        let drawn = if number % ARMS_EVERY == 0 {
            let which = (number / ARMS_EVERY) as usize % arms.len();
            Some(arm(&mut random, &arms[which]))
        } else {
            Sample::draw(&mut random)
        };
        let Some(sample) = drawn else { continue };
        let (Ok(pack), Some(frames)) = (pack(&sample.written, 0), Frames::of(&sample.written))
        else {
            continue;
        };
        tally.machines += 1;
        while tally.postures < POSTURES.into() {
            let Some(values) = special(&mut random, &sample) else {
                break;
            };
            let Some(wanted) = target(&mut random, &sample.built, &values) else {
                break;
            };
            let moved: Vec<f64> = values.iter().map(|v| v + lie.values).collect();
            let variables = pack
                .drives
                .iter()
                .zip(&pack.machine.variables)
                .map(|(drive, variable)| {
                    let value = (moved[drive.joint] - drive.offset) / drive.multiple;
                    match variable.motion {
                        Motion::Turn => value,
                        Motion::Slide => value / pack.scale,
                    }
                })
                .collect();
            let case = Case {
                truth: Truth::of(&frames, &sample.built, &moved, pack.scale),
                variables,
                axes: axes(&wanted),
                name: format!("seed {seed} machine {number} posture {}", tally.postures),
                pack: &pack,
            };
            tally.postures += 1;
            checks(&mut random, &case, &wanted, &mut tally);
        }
    }
    tally
}

/// All checks of one posture and target.
fn checks(random: &mut impl Rng, case: &Case, wanted: &Target, tally: &mut Tally) {
    let chain = case.pack.machine.chain();
    let goal = Goal::new(&pack_target(wanted, case.pack.scale));
    // Some with a random choice of rules, whose boxes others would tighten.
    let rules = if random.random_bool(0.75) {
        Rules::ALL
    } else {
        Rules(random.random())
    };
    let mut cells = vec![Cell::ANYTHING; cells_for(chain.joints.len())];
    let mut network = Network::new(chain, &goal, rules, &mut cells);
    let mut simplex = NodeSimplex::new();
    let whole = limits(chain);
    let left = case.check(&mut network, &whole, &mut simplex, tally);
    for _ in 0..STEPS[0] {
        let spans = case.around(random, &whole);
        case.check(&mut network, &spans, &mut simplex, tally);
    }
    let mut part = left.clone();
    for _ in 0..STEPS[1] {
        let half = case.half(random, &part, tally);
        part = case.check(&mut network, &half, &mut simplex, tally);
    }
    let mut part = left;
    for _ in 0..STEPS[2] {
        let cut = case.branch(&mut network, &part, tally);
        part = case.check(&mut network, &cut, &mut simplex, tally);
    }
}

/// At least so many checks on every processor; the same for any number of them.
pub fn run(checks: u64, seed: u64, lie: Lie, progress: &ProgressBar) -> Tally {
    let arms = Arm::all();
    let machines = checks.div_ceil(CHECKS_PER_MACHINE);
    progress.set_length(machines);
    let tallies: Vec<Tally> = (0..machines)
        .into_par_iter()
        .map(|number| {
            let tally = machine(seed, number, &arms, lie);
            progress.inc(1);
            tally
        })
        .collect();
    progress.finish_and_clear();
    tallies.into_iter().fold(Tally::default(), Tally::plus)
}

/// Runs and prints a table, then what is needed to repeat the first violations. With `only`, one
/// machine of the run.
pub fn print(checks: u64, seed: u64, only: Option<u64>) {
    let tally = match only {
        Some(number) => machine(seed, number, &Arm::all(), Lie::default()),
        None => run(checks, seed, Lie::default(), &ProgressBar::new(0)),
    };
    println!(
        "{} machines, {} postures, {} checks, {} violations\n",
        tally.machines,
        tally.postures,
        tally.checks,
        tally.violations()
    );
    println!("| compared with the truth | comparisons | violations | least margin, units |");
    println!("|---|---|---|---|");
    for kind in Kinds::ALL {
        let own = tally.of(kind);
        println!(
            "| {} | {} | {} | {:.2e} |",
            kind.name(),
            own.compared,
            own.violations,
            own.least
        );
    }
    for failure in &tally.failures {
        println!("\n{failure}");
    }
}
