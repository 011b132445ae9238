//! The truth lies in whatever a rule gives.

use std::collections::BTreeMap;

use dashu_int::IBig;

use super::world::{Dice, World, is_loose, world};
use crate::check::Reason;
use crate::exact::interval::{Interval, grains};
use crate::geometry::Geometry;
use crate::grammar::{self, Malformed, NAMES, Reader};
use crate::known::{Known, image};
use crate::machine::{Chain, Kind, Machine};
use crate::problem::Problem;
use crate::proof::{Feature, Part, Place, Quantity, Relation, Rule};
use crate::relation::{Monomial, polynomial};
use crate::rule::confine;
use crate::target::Target;
use crate::wanted::Wanted;

/// What floating point may be off by.
const ALLOWANCE: f64 = 1e-9;

fn to_grains(number: f64) -> IBig {
    grains((number * 1e12).round() as i64)
}

fn to_float(number: &IBig) -> f64 {
    number.to_f64().value() / 1e24
}

/// Gives random arguments to the grammar.
struct Arguments<'a> {
    dice: &'a mut Dice,
    joints: u64,
    cones: u64,
}

impl Reader for Arguments<'_> {
    fn index(&mut self) -> Result<u8, Malformed> {
        Ok(self.dice.below(self.joints + 1) as u8)
    }

    fn feature(&mut self) -> Result<Feature, Malformed> {
        let joint = 1 + self.dice.below(self.joints.max(1)) as u8;
        Ok(match self.dice.below(if self.cones > 0 { 5 } else { 4 }) {
            0 => Feature::Tip,
            1 => Feature::TipAxis(self.dice.below(3) as u8),
            2 if self.joints > 0 => Feature::Origin(joint),
            3 if self.joints > 0 => Feature::Axis(joint),
            4 => Feature::Cone(1 + self.dice.below(self.cones) as u8),
            _ => Feature::Tip,
        })
    }

    fn place(&mut self) -> Result<Place, Malformed> {
        let joint = 1 + self.dice.below(self.joints.max(1)) as u8;
        Ok(match self.dice.below(5) {
            0 if self.joints > 0 => Place::Before(joint),
            1 if self.joints > 0 => Place::After(joint),
            2 => Place::End,
            3 => Place::Difference,
            _ => Place::Base,
        })
    }

    fn rule(&mut self) -> Result<u8, Malformed> {
        Ok(self.dice.below(42) as u8)
    }

    fn list(&mut self) -> Result<Vec<(i64, Relation)>, Malformed> {
        let mut list = Vec::new();
        for _ in 0..1 + self.dice.below(4) {
            let multiplier = self.dice.below(9) as i64 - 4;
            let number = Reader::rule(self)?;
            list.push((multiplier, grammar::relation(number, self)?));
        }
        Ok(list)
    }
}

/// The quantities that a rule may speak of.
fn subjects(problem: &Problem, rule: &Rule) -> Vec<Quantity> {
    let parts = |f, p| [Part::X, Part::Y, Part::Z].map(|part| Quantity::View(f, p, part));
    let relations = match rule {
        Rule::One(relation) => vec![*relation],
        Rule::Sum(list) => list.iter().map(|(_, relation)| *relation).collect(),
        Rule::Cosine(i) => return vec![Quantity::Cosine(*i)],
        Rule::Sine(i) => return vec![Quantity::Sine(*i)],
        Rule::Angle(i, _) | Rule::AngleOfCircle(i) => return vec![Quantity::Value(*i)],
        Rule::Sector(i, f) => {
            return [parts(*f, Place::Before(*i)), parts(*f, Place::After(*i))].concat();
        }
        Rule::Spread(f) => return [parts(*f, Place::End), parts(*f, Place::Difference)].concat(),
        Rule::SpreadCone(k, f) => return vec![Quantity::Along(*f, *k), Quantity::Aim(*f, *k)],
        Rule::Tilt(k) => return parts(Feature::Cone(*k), Place::Base).to_vec(),
    };
    let mut all = Vec::new();
    for relation in relations {
        for term in polynomial(problem, relation).map_or(Vec::new(), |p| p.terms) {
            match term.of {
                Monomial::One(a) => all.push(a),
                Monomial::Two(a, b) => all.extend([a, b]),
            }
        }
    }
    all.sort();
    all.dedup();
    all
}

/// What a rule speaks of besides: what it reads.
fn inputs(problem: &Problem, rule: &Rule) -> Vec<Quantity> {
    let all =
        |f, p| [Part::X, Part::Y, Part::Z, Part::Square].map(|part| Quantity::View(f, p, part));
    let mut read = subjects(problem, rule);
    match *rule {
        Rule::Cosine(i) | Rule::Sine(i) => read.push(Quantity::Value(i)),
        Rule::AngleOfCircle(i) => read.extend([Quantity::Cosine(i), Quantity::Sine(i)]),
        Rule::Angle(i, f) | Rule::Sector(i, f) => {
            read.extend(all(f, Place::Before(i)));
            read.extend(all(f, Place::After(i)));
            read.extend([Quantity::Value(i), Quantity::Radius(f, i)]);
        }
        Rule::Spread(f) | Rule::SpreadCone(_, f) => {
            read.extend(all(f, Place::End));
            read.extend(all(f, Place::Difference));
        }
        _ => {}
    }
    read.retain(|quantity| problem.has(*quantity));
    read
}

/// Runs `judge` on a problem built from the world `seed`.
fn with_problem(seed: u64, judge: impl FnOnce(&World, &Problem, &[Interval])) {
    let world = world(seed);
    let machine = Machine::read(&world.machine).expect(&world.machine);
    let chain = Chain::new(&machine, world.tip).expect("a chain");
    let geometry = Geometry::new(&chain, &world.frames).expect("frames");
    let target = Target::read(&world.target).expect(&world.target);
    let wanted = Wanted::new(&target).expect("a rotation");
    let spans = world.variables.iter();
    let root: Vec<Interval> = spans
        .map(|(_, lo, hi)| Interval::new(to_grains(*lo), to_grains(*hi)))
        .collect();
    assert_eq!(root.len(), chain.variables.len());
    let mut rho = geometry.reach.clone();
    for joint in chain
        .moving
        .iter()
        .filter(|joint| joint.kind == Kind::Prismatic)
    {
        rho += image(&joint.drive, &root[joint.drive.variable]).size();
    }
    let problem = Problem {
        chain: &chain,
        geometry: &geometry,
        wanted: &wanted,
        rho,
    };
    judge(&world, &problem, &root);
}

/// Everything that begins within `allowance` of the truth must have it.
fn holds(range: &Interval, truth: f64) -> bool {
    let allowance = to_grains(ALLOWANCE);
    let truth = to_grains(truth);
    range.lo <= &truth + &allowance && range.hi >= truth - allowance
}

/// Narrows what `rule` reads to random boxes about the truth, as wide as `10^-size`.
fn prepare(known: &mut Known, world: &World, read: &[Quantity], dice: &mut Dice) {
    let size = dice.between(0.0, 5.0);
    for quantity in read {
        let truth = world.truth(*quantity);
        let width = 10f64.powf(-size);
        // Often at an end of the box, where a bound is met.
        let (below, above) = match dice.below(3) {
            0 => (0.0, width),
            1 => (width, 0.0),
            _ => (dice.between(0.0, width), dice.between(0.0, width)),
        };
        let near = Interval::new(
            to_grains(truth - below - 1e-11),
            to_grains(truth + above + 1e-11),
        );
        let start = known.get(*quantity);
        assert!(holds(&start, truth), "{quantity:?} {truth} {start:?}");
        // Where floating point falls just outside of what is known, nothing is narrowed.
        let bound = start.meet(&near);
        if !bound.is_empty() {
            let _ = known.narrow(*quantity, bound);
        }
    }
}

#[test]
fn the_truth_lies_in_what_every_rule_gives() {
    let mut uses: BTreeMap<&str, u32> = BTreeMap::new();
    for seed in 0..300 {
        with_problem(seed, |world, problem, root| {
            let mut dice = Dice(seed + 77);
            for number in (0..NAMES.len() as u8).cycle().take(8 * NAMES.len()) {
                let mut arguments = Arguments {
                    dice: &mut dice,
                    joints: problem.joints() as u64,
                    cones: problem.wanted.cones.len() as u64,
                };
                let rule = grammar::rule(number, &mut arguments).expect("a rule");
                let mut known = Known::new(problem, root);
                prepare(&mut known, world, &inputs(problem, &rule), &mut dice);
                for quantity in subjects(problem, &rule) {
                    if !problem.has(quantity) {
                        continue;
                    }
                    if let Ok(range) = confine(problem, &known, &rule, Some(quantity)) {
                        let truth = world.truth(quantity);
                        assert!(
                            holds(&range.meet(&known.get(quantity)), truth),
                            "{seed} {rule:?} {quantity:?} {truth} {} {}\n{}{}",
                            to_float(&range.lo),
                            to_float(&range.hi),
                            world.machine,
                            world.target
                        );
                        *uses.entry(NAMES[usize::from(number)]).or_default() += 1;
                    }
                }
                if matches!(rule, Rule::Sum(_))
                    && let Ok(range) = confine(problem, &known, &rule, None)
                {
                    assert!(!range.is_empty(), "{seed} {rule:?}");
                }
            }
        });
    }
    for name in NAMES {
        let used = uses.get(name).copied().unwrap_or(0);
        assert!(used >= 40, "{name} was applied {used} times");
    }
}

/// The second place of a link, seen from the first, is off its written place by no more than lambda.
#[test]
fn places_are_within_lambda() {
    let mut moved = 0;
    for seed in 0..1000 {
        with_problem(seed, |world, problem, _| {
            for (number, link) in problem.geometry.links.iter().enumerate() {
                let e = world.shift(number, problem.joints());
                let off = [0, 1, 2].map(|i| e[i] - to_float(&link.origin[i].lo));
                let off = off.iter().map(|x| x * x).sum::<f64>().sqrt();
                assert!(
                    off <= to_float(&link.lambda) + ALLOWANCE,
                    "{seed} {number} {off}"
                );
                moved += u32::from(off > 1e-6);
            }
        });
    }
    assert!(moved > 200, "{moved}");
}

/// From boxes of a millionth about the truth, a relation of a machine without tolerances gives a
/// narrow interval: the rules are not merely wide.
#[test]
fn relations_are_tight() {
    let mut narrow: BTreeMap<&str, u32> = BTreeMap::new();
    for seed in (0..200).filter(|seed| !is_loose(*seed)) {
        with_problem(seed, |world, problem, root| {
            let mut dice = Dice(seed + 7);
            for number in (0..42u8).cycle().take(42 * 4) {
                let mut arguments = Arguments {
                    dice: &mut dice,
                    joints: problem.joints() as u64,
                    cones: problem.wanted.cones.len() as u64,
                };
                let relation = grammar::relation(number, &mut arguments).expect("a relation");
                let rule = Rule::One(relation);
                let quantities = subjects(problem, &rule);
                for quantity in &quantities {
                    let mut known = Known::new(problem, root);
                    for other in quantities.iter().filter(|other| *other != quantity) {
                        let truth = world.truth(*other);
                        let near = Interval::new(to_grains(truth - 1e-9), to_grains(truth + 1e-9));
                        let bound = known.get(*other).meet(&near);
                        if !bound.is_empty() {
                            let _ = known.narrow(*other, bound);
                        }
                    }
                    // A square leaves open the sign, which is given here.
                    let mut side = known.get(*quantity);
                    if world.truth(*quantity) > 0.0 {
                        side.lo = side.lo.max(IBig::ZERO);
                    } else {
                        side.hi = side.hi.min(IBig::ZERO);
                    }
                    let _ = known.narrow(*quantity, side);
                    if matches!(relation, Relation::Trace | Relation::Cone(_)) {
                        continue;
                    }
                    match confine(problem, &known, &rule, Some(*quantity)) {
                        Ok(range) if range.width() < to_grains(1e-4) => {
                            *narrow.entry(NAMES[usize::from(number)]).or_default() += 1;
                        }
                        Ok(_) | Err(Reason::TouchesZero | Reason::Ambiguous) => {}
                        Err(other) => panic!("{other}"),
                    }
                }
            }
        });
    }
    for name in &NAMES[..42] {
        let used = narrow.get(name).copied().unwrap_or(0);
        assert!(
            used >= 20 || ["trace", "cone"].contains(name),
            "{name}: {used}"
        );
    }
}

/// What a rule reads, narrowed to a billionth about the truth.
fn read_closely<'a>(
    problem: &'a Problem<'a>,
    world: &World,
    root: &[Interval],
    rule: &Rule,
) -> Known<'a> {
    let mut known = Known::new(problem, root);
    for quantity in inputs(problem, rule) {
        let truth = world.truth(quantity);
        let near = Interval::new(to_grains(truth - 1e-9), to_grains(truth + 1e-9));
        let bound = known.get(quantity).meet(&near);
        if !bound.is_empty() {
            let _ = known.narrow(quantity, bound);
        }
    }
    known
}

/// The rules about directions give a narrow interval on both sides of a joint.
#[test]
fn directions_are_tight() {
    let mut narrow: BTreeMap<(&str, Option<Place>), u32> = BTreeMap::new();
    for seed in (0..200).filter(|seed| !is_loose(*seed)) {
        with_problem(seed, |world, problem, root| {
            let joints = (1..=problem.joints() as u8).filter(|joint| problem.is_revolute(*joint));
            for joint in joints {
                let (before, after) = (Place::Before(joint), Place::After(joint));
                let view = |place, part| Quantity::View(Feature::Tip, place, part);
                let mut cases = vec![
                    (
                        "angle",
                        Rule::Angle(joint, Feature::Tip),
                        Quantity::Value(joint),
                    ),
                    (
                        "angle.c",
                        Rule::AngleOfCircle(joint),
                        Quantity::Value(joint),
                    ),
                ];
                for place in [before, after] {
                    for part in [Part::X, Part::Y] {
                        let rule = Rule::Sector(joint, Feature::Tip);
                        cases.push(("sector", rule, view(place, part)));
                    }
                }
                for (name, rule, quantity) in cases {
                    let known = read_closely(problem, world, root, &rule);
                    match confine(problem, &known, &rule, Some(quantity)) {
                        Ok(range) => {
                            assert!(holds(&range, world.truth(quantity)), "{seed} {rule:?}");
                            let side = match quantity {
                                Quantity::View(_, Place::Before(_), _) => Some(Place::Before(0)),
                                Quantity::View(..) => Some(Place::After(0)),
                                _ => None,
                            };
                            let is_narrow = range.width() < to_grains(1e-4);
                            *narrow.entry((name, side)).or_default() += u32::from(is_narrow);
                        }
                        Err(reason) => assert_eq!(reason, Reason::TouchesZero, "{seed} {rule:?}"),
                    }
                }
            }
        });
    }
    assert_eq!(narrow.len(), 4, "{narrow:?}");
    assert!(narrow.values().all(|used| *used >= 20), "{narrow:?}");
}

/// Asked about any quantity at all, a rule says the truth or nothing.
#[test]
fn rules_do_not_speak_of_what_they_do_not_bound() {
    let mut answers = [0; 2];
    for seed in 0..150 {
        with_problem(seed, |world, problem, root| {
            let mut dice = Dice(seed + 5);
            for number in (0..NAMES.len() as u8).cycle().take(4 * NAMES.len()) {
                let mut arguments = Arguments {
                    dice: &mut dice,
                    joints: problem.joints() as u64,
                    cones: problem.wanted.cones.len() as u64,
                };
                let rule = grammar::rule(number, &mut arguments).expect("a rule");
                for _ in 0..4 {
                    let (feature, place) = (arguments.feature(), arguments.place());
                    let (feature, place) = (feature.expect("one"), place.expect("one"));
                    let part = [Part::X, Part::Y, Part::Z, Part::Square];
                    let part = part[arguments.dice.below(4) as usize];
                    let quantity = Quantity::View(feature, place, part);
                    if !problem.has(quantity) {
                        continue;
                    }
                    let known = read_closely(problem, world, root, &rule);
                    let said = confine(problem, &known, &rule, Some(quantity));
                    answers[usize::from(said.is_ok())] += 1;
                    if let Ok(range) = said {
                        let truth = world.truth(quantity);
                        assert!(
                            holds(&range.meet(&known.get(quantity)), truth),
                            "{seed} {rule:?} {quantity:?} {truth}"
                        );
                    }
                }
            }
        });
    }
    assert!(answers.iter().all(|count| *count > 200), "{answers:?}");
}

/// The largest component of a tip axis that an orientation within an angle allows is that of the
/// nearest direction on the cone, or one inside of it.
#[test]
fn spread_is_the_nearest_direction() {
    let mut cases = [0; 2];
    for seed in 0..100 {
        with_problem(seed, |_, problem, root| {
            let Some((rotation, angle)) = &problem.wanted.orientation else {
                return;
            };
            let known = Known::new(problem, root);
            let (cosine, sine) = (to_float(&angle.cosine.lo), to_float(&angle.sine.hi));
            for axis in 0..3u8 {
                let feature = Feature::TipAxis(axis);
                for (row, part) in [Part::X, Part::Y, Part::Z].into_iter().enumerate() {
                    let nominal = to_float(&rotation[row][usize::from(axis)].lo);
                    let most = |nominal: f64| {
                        if nominal >= cosine {
                            1.0
                        } else {
                            nominal * cosine + (1.0 - nominal * nominal).max(0.0).sqrt() * sine
                        }
                    };
                    let quantity = Quantity::View(feature, Place::Difference, part);
                    let rule = Rule::Spread(feature);
                    let range =
                        confine(problem, &known, &rule, Some(quantity)).expect("it applies");
                    let expected = [-most(-nominal), most(nominal)];
                    for (found, expected) in [range.lo, range.hi].iter().zip(expected) {
                        let off = (to_float(found) - expected).abs();
                        assert!(off < 1e-6, "{seed} {quantity:?}: {off}");
                    }
                    cases[usize::from(nominal >= cosine)] += 1;
                }
            }
        });
    }
    assert!(cases.iter().all(|count| *count > 50), "{cases:?}");
}
