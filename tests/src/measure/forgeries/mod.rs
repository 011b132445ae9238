//! Forged proofs: what the checker says of proofs that were tampered with.
//!
//! Whether a tampered proof still proves its target is what the checker decides, so its answer is
//! judged from outside. Some changes never leave a proof: accepted, they are wrong. Of every other
//! accepted one the tree must close and the root cover the limits, by plain reasoning here. And
//! every tampered proof is turned against reachable targets beside its own, of which a posture is
//! known: none may be accepted, and no accepted step of one, up to the first that is not, may
//! contradict the posture.

mod edits;
mod reachable;
mod truth;

use crate::families::{Family, Kind, NAMES};
use crate::measure::proofs::Bench;
use balk::model::Target;
use balk::prove::Subject;
use balk::search::Verdict;
use balk::write::target_line;
use balk_checker::proof::{Item, PICO, Proof, Span};
use balk_checker::{Checker, binary};
use edits::{Edit, end_of};
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rayon::prelude::*;
use reachable::{Reachable, beside, gapped, mended};
use sha2::{Digest, Sha256};
use std::time::Instant;
use truth::{Truth, accepted};

/// Most steps of a proof in one part, and of one in several.
const MOST_STEPS: [usize; 2] = [60, 400];
/// Parts a proof may look at.
const PARTS: u64 = 40;
/// Bytes of a digest.
const DIGEST: usize = 32;

/// What became of the forgeries of one kind.
#[derive(Clone, Debug, Default)]
pub struct Row {
    /// What was changed.
    pub name: &'static str,
    /// Why some are still proofs.
    pub why: &'static str,
    /// Tampered proofs.
    pub tried: u64,
    /// Of those, not read as a proof.
    pub unread: u64,
    /// Of those, accepted.
    pub accepted: u64,
    /// Times that one of them was turned against a reachable target.
    pub turned: u64,
    /// What should not have happened.
    pub wrong: Vec<String>,
}

impl Row {
    fn plus(mut self, other: Row) -> Row {
        if self.name.is_empty() {
            (self.name, self.why) = (other.name, other.why);
        }
        self.tried += other.tried;
        self.unread += other.unread;
        self.accepted += other.accepted;
        self.turned += other.turned;
        self.wrong.extend(other.wrong);
        self
    }

    fn print(&self) {
        let Row {
            name,
            why,
            tried,
            unread,
            accepted,
            turned,
            wrong,
        } = self;
        let rejected = tried - unread - accepted;
        println!(
            "| {name} | {tried} | {unread} | {rejected} | {accepted} | {turned} | {} | {why} |",
            wrong.len()
        );
    }
}

/// A proof of an unreachable target, and reachable targets beside it.
pub struct Case<'a> {
    family: &'a Family,
    checker: &'a Checker,
    /// As the prover wrote it.
    pub proof: Proof,
    /// The same as bytes.
    bytes: Vec<u8>,
    line: String,
    target: Target,
    beside: Vec<Reachable>,
}

/// The arms with their provers and checkers.
pub struct Arms(Vec<(Family, Bench)>);

impl Arms {
    /// All three.
    pub fn new() -> Arms {
        Arms(
            Family::all()
                .into_iter()
                .map(|family| {
                    let bench = Bench::new(&family.machine, &family.text);
                    (family, bench)
                })
                .collect(),
        )
    }

    /// That many proofs, of all arms and kinds of target in turn. Short ones seldom have splits, so
    /// every third is split once more in the middle of a span, with the same steps on both sides.
    pub fn cases(&self, count: usize, seed: u64) -> Vec<Case<'_>> {
        let kinds = self.0.len() * Kind::ALL.len();
        let each = count.div_ceil(kinds);
        let turns: Vec<_> = self
            .0
            .iter()
            .flat_map(|arm| Kind::ALL.map(|kind| (arm, kind)))
            .collect();
        let mut cases: Vec<Vec<Case>> = turns
            .into_par_iter()
            .map(|((family, bench), kind)| {
                let targets = family.targets(kind, 60 * each + 200, seed);
                let cases = targets
                    .iter()
                    .filter_map(|target| Case::new(family, bench, target, seed));
                cases.take(each).collect()
            })
            .collect();
        let mut all = Vec::new();
        for _ in 0..each {
            all.extend(cases.iter_mut().filter_map(Vec::pop));
        }
        all.truncate(count);
        for (number, case) in all.iter_mut().enumerate().skip(2).step_by(3) {
            case.split(number);
        }
        all
    }
}

impl Default for Arms {
    fn default() -> Arms {
        Arms::new()
    }
}

fn splits(proof: &Proof) -> usize {
    let split = |item: &&Item| matches!(item, Item::Split { .. });
    proof.items.iter().filter(split).count()
}

impl<'a> Case<'a> {
    /// The proof of a target, if it is unreachable and the proof not too long.
    fn new(family: &'a Family, bench: &'a Bench, target: &Target, seed: u64) -> Option<Case<'a>> {
        let Verdict::Unreachable { proof: search } = family.solver.decide(target, 100).verdict
        else {
            return None;
        };
        let line = target_line(target, &family.machine.tips[0].name);
        let subject = Subject {
            target,
            line: &line,
            search,
        };
        let proof = bench.prover.prove(&subject, PARTS).ok()?;
        if proof.items.len() > MOST_STEPS[usize::from(splits(&proof) > 0)] {
            return None;
        }
        let mut random = ChaCha8Rng::seed_from_u64(seed);
        let beside = beside(family, target, &mut random);
        Some(Case {
            family,
            checker: &bench.checker,
            bytes: binary::write(&proof).ok()?,
            target: target.clone(),
            proof,
            line,
            beside,
        })
    }

    /// Splits the span of a variable in its middle.
    fn split(&mut self, number: usize) {
        let variable = number % self.proof.root.len();
        let Span { lo, hi } = self.proof.root[variable];
        let split = Item::Split {
            variable: variable as u8 + 1,
            at: lo + (hi - lo) / 2,
        };
        let items = &self.proof.items;
        // One step twice, so that the halves differ.
        self.proof.items = [&[split], &items[..1], &items[..], items].concat();
        self.bytes = binary::write(&self.proof).expect("the format holds it");
        let valid = self.checker.check(&self.proof, &self.line);
        assert!(valid.is_ok(), "{valid:?}");
    }

    /// What is wrong if `forged` is accepted although it may be a proof: it is of something else,
    /// its root does not cover the limits, or a branch has no end.
    fn fault(&self, forged: &Proof) -> Option<&'static str> {
        let meaning = |line: &str| serde_json::from_str::<serde_json::Value>(line).ok();
        if forged.machine != self.proof.machine || forged.tip != self.proof.tip {
            return Some("a proof of another machine or tip");
        }
        if meaning(&forged.target) != meaning(&self.line) {
            return Some("a proof of another target");
        }
        let drives = &self.family.solver.pack.drives;
        let unit = |end: i64| end as f64 / PICO as f64;
        let covered = drives.iter().zip(&forged.root).all(|(drive, span)| {
            unit(span.lo) <= drive.limits[0] && drive.limits[1] <= unit(span.hi)
        });
        if !covered || drives.len() != forged.root.len() {
            return Some("a root that does not cover the limits");
        }
        (end_of(&forged.items, 0) != Some(forged.items.len())).then_some("a branch without an end")
    }

    /// Checks a tampered proof against its own target, and turned against one beside it.
    fn judge(&self, forged: &Proof, never: bool, turn: usize) -> Row {
        let mut row = Row {
            tried: 1,
            ..Row::default()
        };
        if self.checker.check(forged, &self.line).is_ok() {
            row.accepted = 1;
            let never = never.then_some("of a kind that is never a proof");
            let fault = never.or_else(|| self.fault(forged));
            row.wrong
                .extend(fault.map(|fault| format!("accepted {fault}: {}", self.line)));
        }
        if let Some(of) = self.beside.get(turn % self.beside.len().max(1)) {
            row = row.plus(self.turned(forged, of));
        }
        row
    }

    /// Turns a tampered proof against a reachable target.
    fn turned(&self, forged: &Proof, of: &Reachable) -> Row {
        let proof = Proof {
            target: of.line.clone(),
            ..forged.clone()
        };
        let result = self.checker.check(&proof, &of.line);
        let mut row = Row {
            turned: 1,
            ..Row::default()
        };
        if result.is_ok() {
            row.wrong
                .push(format!("accepted for a reachable target: {}", of.line));
        }
        let truth = Truth::of(&self.family.machine, &of.values, &of.target, &proof.frames);
        if let Some(item) = truth.contradicts(&proof, accepted(&proof, &result)) {
            row.wrong
                .push(format!("item {item} contradicts a posture: {}", of.line));
        }
        row
    }

    /// Whether the posture of every target beside this one contradicts the untouched proof, as it
    /// must of any proof at all.
    pub fn is_contradicted(&self) -> bool {
        let all = self.proof.items.len();
        self.beside.iter().all(|of| {
            let truth = Truth::of(
                &self.family.machine,
                &of.values,
                &of.target,
                &self.proof.frames,
            );
            truth.contradicts(&self.proof, all).is_some()
        })
    }

    /// Every bit flipped: as it is, and with the digest at the end made right again.
    pub fn flips(&self, resealed: bool) -> Row {
        let end = if resealed {
            self.bytes.len() - DIGEST
        } else {
            self.bytes.len()
        };
        let flips = (0..end * 8).into_par_iter().map(|bit| {
            let mut bytes = self.bytes.clone();
            bytes[bit / 8] ^= 1 << (bit % 8);
            if resealed {
                let digest = Sha256::digest(&bytes[..end]);
                bytes[end..].copy_from_slice(&digest);
            }
            match binary::read(&bytes) {
                Ok(forged) => self.judge(&forged, !resealed, bit),
                Err(_) => Row {
                    tried: 1,
                    unread: 1,
                    ..Row::default()
                },
            }
        });
        let row = flips.reduce(Row::default, Row::plus);
        if resealed {
            let why = "search digest, bounds with room to spare, numbers spelled otherwise";
            Row {
                name: "one bit, digest made right",
                why,
                ..row
            }
        } else {
            Row {
                name: "one bit",
                ..row
            }
        }
    }

    /// That many changes of one kind.
    pub fn edits(&self, edit: Edit, count: u64, seed: u64) -> Row {
        let (name, why) = edit.describe();
        let mut random = ChaCha8Rng::seed_from_u64(seed);
        let mut all = Row {
            name,
            why: why.unwrap_or_default(),
            ..Row::default()
        };
        for turn in 0..count {
            if let Some(forged) = edit.apply(&self.proof, &mut random) {
                // What the bytes can hold reads back.
                if let Ok(bytes) = binary::write(&forged)
                    && binary::read(&bytes).as_ref() != Ok(&forged)
                {
                    all.wrong
                        .push(format!("reads back differently: {}", self.line));
                }
                all = all.plus(self.judge(&forged, why.is_none(), turn as usize));
            }
        }
        all
    }

    /// The untouched proof for other machines, with their digests and without.
    fn other_machines(&self) -> Row {
        let text = &self.family.text;
        let tip = &self.proof.tip;
        let limits = text.split("limits_deg = [").nth(1);
        let lower = limits.and_then(|rest| rest.split(',').next());
        let lower = lower.expect("the first joint has limits");
        let wider = text.replacen(&format!("[{lower},"), &format!("[{lower}.000000001,"), 1);
        let revolute = "kind = \"revolute\"\n";
        let loose = format!("{revolute}tolerance = {{ xyz = 1e-9 }}\n");
        let looser = text.replacen(revolute, &loose, 1);
        // The other arms, with a tip of this one's name.
        let others = NAMES.into_iter().map(|name| {
            let other = Family::read(name);
            let tips = [&other.machine.tips[0].name, tip];
            let [theirs, ours] = tips.map(|tip| format!("name = {tip:?}"));
            other.text.replace(&theirs, &ours)
        });
        let others = others
            .filter(|other| other != text)
            .map(|other| (other, false));
        let mut row = Row {
            name: "another machine",
            ..Row::default()
        };
        for (other, never) in [(wider, true), (looser, false)].into_iter().chain(others) {
            let checker = Checker::new(&other, tip).expect("the machine is well written");
            row.tried += 1;
            if checker.check(&self.proof, &self.line).is_ok() {
                row.wrong
                    .push(format!("accepted for another machine: {}", self.line));
            }
            // With the other's digest it is a proof only if every step holds for the other as well.
            let forged = Proof {
                machine: checker.digest(),
                ..self.proof.clone()
            };
            row.tried += 1;
            if checker.check(&forged, &self.line).is_ok() {
                row.accepted += 1;
                if never {
                    row.wrong
                        .push(format!("accepted with another's digest: {}", self.line));
                }
            }
        }
        row.why = "the other's digest, a tolerance of 1 nm more, and room to spare";
        row
    }

    /// The untouched proof for other targets and tips.
    fn other_targets(&self) -> Row {
        let mut row = Row {
            name: "another target, tolerance or tip",
            ..Row::default()
        };
        let mut others: Vec<String> = self.beside.iter().map(|of| of.line.clone()).collect();
        let tip = &self.proof.tip;
        for change in 0..4 {
            let mut other = self.target.clone();
            match change {
                0 => other.id.push('x'),
                1 => other.xyz.x += 1e-12,
                2 => other.xyz_within.y *= 1.0 + 1e-12,
                _ => other.xyz_within.z *= 0.5,
            }
            others.push(target_line(&other, tip));
        }
        others.push(target_line(&self.target, "another"));
        for line in others {
            row.tried += 1;
            if self.checker.check(&self.proof, &line).is_ok() {
                row.wrong
                    .push(format!("accepted for another target: {line}"));
            }
        }
        row
    }

    /// Proofs of narrower limits for the reachable targets beside this one.
    fn gaps(&self) -> Row {
        let mut all = Row {
            name: "narrower limits, alone or joined",
            ..Row::default()
        };
        for of in &self.beside {
            for forged in gapped(self.family, self.checker.digest(), of) {
                all.tried += 1;
                all = all.plus(self.turned(&forged, of));
            }
        }
        all
    }

    /// This proof mended for the reachable targets beside it.
    fn mended(&self) -> Row {
        let mut all = Row {
            name: "mended step by step",
            ..Row::default()
        };
        for of in &self.beside {
            let truth = Truth::of(
                &self.family.machine,
                &of.values,
                &of.target,
                &self.proof.frames,
            );
            all.tried += 1;
            all.turned += 1;
            all.wrong
                .extend(mended(self.checker, self.proof.clone(), of, &truth));
        }
        all
    }
}

/// All forgeries: every bit flipped and left so in all proofs, and made right again in the first
/// `flipped`; `edits` changes of one field spread evenly over proofs and kinds; the rest once for
/// every proof.
pub fn all(cases: &[Case], flipped: usize, edits: u64, seed: u64) -> Vec<Row> {
    let per = edits.div_ceil((Edit::ALL.len() * cases.len()) as u64);
    let over = |of: &(dyn Fn(usize, &Case) -> Row + Sync)| {
        let rows = cases
            .par_iter()
            .enumerate()
            .map(|(number, case)| of(number, case));
        rows.reduce(Row::default, Row::plus)
    };
    let mut rows = vec![over(&|_, case| case.flips(false))];
    let resealed = cases.iter().take(flipped).map(|case| case.flips(true));
    rows.push(resealed.fold(Row::default(), Row::plus));
    rows.extend(Edit::ALL.map(|edit| {
        over(&|number, case| case.edits(edit, per, seed + ((number as u64) << 8) + edit as u64))
    }));
    rows.push(over(&|_, case| case.other_machines()));
    rows.push(over(&|_, case| case.other_targets()));
    rows.push(over(&|_, case| case.gaps()));
    rows.push(over(&|_, case| case.mended()));
    rows
}

/// Prints the table.
pub fn run(proofs: usize, flipped: usize, edits: u64, seed: u64) {
    let clock = Instant::now();
    let arms = Arms::new();
    let cases = arms.cases(proofs, seed);
    let mut steps: Vec<usize> = cases.iter().map(|case| case.proof.items.len()).collect();
    steps.sort_unstable();
    println!(
        "{} proofs, {} of them with splits; median {} and at most {} items\n",
        cases.len(),
        cases.iter().filter(|case| splits(&case.proof) > 0).count(),
        steps.get(steps.len() / 2).copied().unwrap_or(0),
        steps.last().copied().unwrap_or(0),
    );
    println!(
        "| what is changed | tried | not read | rejected | accepted | turned against a reachable target | wrong | why some are still proofs |"
    );
    println!("|---|---|---|---|---|---|---|---|");
    let rows = all(&cases, flipped, edits, seed);
    rows.iter().for_each(Row::print);
    let total = rows.iter().cloned().fold(Row::default(), Row::plus);
    Row {
        name: "all",
        why: "",
        ..total
    }
    .print();
    println!("\n{:.0} s", clock.elapsed().as_secs_f64());
    for wrong in rows.iter().flat_map(|row| &row.wrong).take(10) {
        eprintln!("{wrong}");
    }
}
