//! Reachable targets beside unreachable ones, and the best forgeries for them: proofs of machines
//! with narrower limits, joined where the posture lies.

use super::edits::end_of;
use super::truth::{Truth, accepted};
use crate::families::Family;
use balk::kinematics::{angle_between, meets, tip_pose, turn_between};
use balk::model::{Orientation, Target};
use balk::posture::Linkage;
use balk::prove::{Prover, Subject};
use balk::search::{Solver, Verdict};
use balk::write::target_line;
use balk_checker::proof::{Claim, Item, PICO, Proof, Span};
use balk_checker::{Checker, Reason, Rejection};
use nalgebra::Unit;
use rand::Rng;

/// How far a widened target reaches beyond the posture that meets it, metres and radians.
const SPARE: f64 = 1e-6;
/// Starts of the search for a posture.
const STARTS: usize = 8;
/// Parts that a proof of narrower limits may look at.
const PARTS: u64 = 8;
/// How far the narrower limits stay away from the posture, radians or metres.
const GAP: f64 = 0.3;

/// A target that a posture meets.
pub struct Reachable {
    /// The target.
    pub target: Target,
    /// Its line.
    pub line: String,
    /// The posture: a value for every joint of the machine.
    pub values: Vec<f64>,
}

/// Two reachable targets beside an unreachable one: the same, widened until the nearest posture
/// found just meets it, and the same, moved to that posture.
pub fn beside(family: &Family, target: &Target, random: &mut impl Rng) -> Vec<Reachable> {
    let drives = &family.solver.pack.drives;
    let linkage = Linkage::new(&family.machine, 0, drives);
    let starts = (0..STARTS).map(|_| {
        let limits = linkage.limits.iter();
        let mut start: Vec<f64> = limits
            .map(|[lo, hi]| random.random_range(*lo..*hi))
            .collect();
        (linkage.seek(target, &mut start), start)
    });
    let Some((_, best)) = starts.min_by(|a, b| a.0.total_cmp(&b.0)) else {
        return Vec::new();
    };
    let mut values = vec![0.0; family.machine.joints.len()];
    for (drive, value) in drives.iter().zip(best) {
        values[drive.joint] = value;
    }
    let pose = tip_pose(&family.machine, &values, 0);
    let turn = pose.rotation.to_rotation_matrix();
    let mut widened = target.clone();
    let off = pose.translation.vector - target.xyz;
    widened.xyz_within = target
        .xyz_within
        .zip_map(&off, |within, off| within.max(off.abs() + SPARE));
    let mut moved = target.clone();
    moved.xyz = pose.translation.vector;
    if let (Orientation::Near { rotation, within }, Orientation::Near { rotation: new, .. }) =
        (&mut widened.orientation, &mut moved.orientation)
    {
        *within = within.max(turn_between(rotation, &turn) + SPARE);
        *new = turn;
    }
    if let (Orientation::Axes(cones), Orientation::Axes(new)) =
        (&mut widened.orientation, &mut moved.orientation)
    {
        for (cone, new) in cones.iter_mut().zip(new) {
            let axis = turn * *cone.tip;
            cone.within = cone.within.max(angle_between(&axis, &cone.base) + SPARE);
            new.base = Unit::new_normalize(axis);
        }
    }
    [widened, moved]
        .into_iter()
        .filter(|target| meets(&family.machine, target, &values, 0.0))
        .map(|target| Reachable {
            line: target_line(&target, &family.machine.tips[0].name),
            values: values.clone(),
            target,
        })
        .collect()
}

/// Proofs that the target is out of reach of the arm with one joint kept below its value in the
/// posture, or above it. Each bears the digest of the arm with all its postures.
fn narrowed(family: &Family, digest: [u8; 32], of: &Reachable, joint: usize) -> [Option<Proof>; 2] {
    [[0, 1], [1, 0]].map(|[kept, moved]| {
        let mut narrow = family.machine.clone();
        let limits = narrow.joints[joint].limits.as_mut()?;
        let end = of.values[joint] + if moved == 1 { -GAP } else { GAP };
        if (end - limits[kept]) * (limits[moved] - limits[kept]) <= 0.0 {
            return None;
        }
        limits[moved] = end;
        // Most are still within reach; the search says so sooner than the prover gives up.
        let solver = Solver::new(&narrow, 0).ok()?;
        let Verdict::Unreachable { proof: search } = solver.decide(&of.target, PARTS).verdict
        else {
            return None;
        };
        let subject = Subject {
            target: &of.target,
            line: &of.line,
            search,
        };
        Prover::new(&narrow, 0, digest).prove(&subject, PARTS).ok()
    })
}

/// Proofs of narrower limits as they are, and two of them joined by a split at the posture: each
/// of their steps follows from the span its part claims, but the parts leave a gap.
pub fn gapped(family: &Family, digest: [u8; 32], of: &Reachable) -> Vec<Proof> {
    let mut forged = Vec::new();
    for (variable, drive) in family.solver.pack.drives.iter().enumerate() {
        let [lower, upper] = narrowed(family, digest, of, drive.joint);
        if let (Some(lower), Some(upper)) = (&lower, &upper) {
            let mut joined = lower.clone();
            joined.root[variable].hi = upper.root[variable].hi;
            let split = Item::Split {
                variable: variable as u8 + 1,
                at: lower.root[variable].hi,
            };
            joined.items.insert(0, split);
            joined.items.extend(upper.items.iter().cloned());
            forged.push(joined);
        }
        forged.extend(lower);
        forged.extend(upper);
    }
    forged
}

/// A proof mended for a target that it does not prove: every claim that does not follow is loosened
/// to what the checker says does, every step that says nothing is left out, until no claim is left
/// to loosen. Returns what the posture contradicts of what was accepted on the way.
pub fn mended(
    checker: &Checker,
    mut proof: Proof,
    of: &Reachable,
    truth: &Truth,
) -> Option<String> {
    proof.target.clone_from(&of.line);
    // Every round loosens or leaves out one of the steps.
    for _ in 0..2 * proof.items.len() {
        let result = checker.check(&proof, &of.line);
        if let Some(item) = truth.contradicts(&proof, accepted(&proof, &result)) {
            return Some(format!(
                "item {item} of a mended proof contradicts {}",
                of.line
            ));
        }
        let Err(Rejection::Item { index, reason, .. }) = result else {
            return result
                .is_ok()
                .then(|| format!("a mended proof is accepted: {}", of.line));
        };
        let end = end_of(&proof.items, index);
        let Item::Step(step) = &mut proof.items[index] else {
            return None;
        };
        match (&reason, step.claim) {
            (Reason::DoesNotFollow(_), Claim::Nothing) => return None,
            (Reason::DoesNotFollow(follows), _) => match span(follows) {
                Some(span) => step.claim = Claim::Within(span),
                None => drop(proof.items.remove(index)),
            },
            (Reason::LeavesNothing, _) => {
                step.claim = Claim::Nothing;
                if let Some(end) = end {
                    proof.items.drain(index + 1..end);
                }
            }
            _ => drop(proof.items.remove(index)),
        }
    }
    None
}

/// `in [lo, hi]` with ends moved outward to whole units.
fn span(follows: &str) -> Option<Span> {
    let (lo, hi) = follows
        .strip_prefix("in [")?
        .strip_suffix(']')?
        .split_once(", ")?;
    let unit = |number: &str| -> Option<f64> { Some(number.parse::<f64>().ok()? * PICO as f64) };
    // The conversion is off by a few units of large numbers.
    Some(Span {
        lo: (unit(lo)? - 9.0).floor() as i64,
        hi: (unit(hi)? + 9.0).ceil() as i64,
    })
}
