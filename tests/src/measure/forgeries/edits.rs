//! Changes of one field of a proof.

use balk_checker::proof::{Claim, Item, PICO, Proof, Rule, Span, Step};
use balk_checker::text;
use rand::Rng;
use rand::seq::IndexedRandom;

/// What is changed.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Edit {
    /// A byte of the machine's digest.
    Machine,
    /// The tip's name.
    Tip,
    /// A number of the target's line.
    Target,
    /// An end of a span of the root, inwards.
    RootNarrower,
    /// A span of the root, left out.
    RootGone,
    /// A frame, left out.
    FrameGone,
    /// All steps of a part, left out with its end.
    PartGone,
    /// A part, a second time after itself.
    PartTwice,
    /// A byte of the search's digest.
    Search,
    /// An end of a span of the root, outwards.
    RootWider,
    /// A number of a frame's quaternion.
    FrameTurn,
    /// A frame's place on its axis.
    FrameShift,
    /// An end of a claim, by one unit.
    BoundByUnit,
    /// An end of a claim, by a random amount.
    Bound,
    /// The quantity of a step.
    Quantity,
    /// The name of a rule or relation of a step.
    Rule,
    /// A number of a joint, link or cone in a step's rule.
    Joint,
    /// A feature in a step's rule.
    Feature,
    /// The kind of a claim.
    Claim,
    /// A multiplier of a sum, or of a relation made a sum of one.
    Multiplier,
    /// A step, left out.
    StepGone,
    /// A step, a second time elsewhere.
    StepTwice,
    /// Two neighbouring steps, exchanged.
    StepsExchanged,
    /// A step, put elsewhere.
    StepMoved,
    /// A step becomes the end of its part; the rest of the part is left out.
    EndEarly,
    /// The place of a split, by one unit.
    SplitByUnit,
    /// The place of a split, by a random amount.
    Split,
    /// The variable of a split.
    SplitVariable,
    /// The two halves of a split, exchanged.
    HalvesExchanged,
}

impl Edit {
    /// All of them, those first that never leave a valid proof.
    pub const ALL: [Edit; 29] = [
        Edit::Machine,
        Edit::Tip,
        Edit::Target,
        Edit::RootNarrower,
        Edit::RootGone,
        Edit::FrameGone,
        Edit::PartGone,
        Edit::PartTwice,
        Edit::Search,
        Edit::RootWider,
        Edit::FrameTurn,
        Edit::FrameShift,
        Edit::BoundByUnit,
        Edit::Bound,
        Edit::Quantity,
        Edit::Rule,
        Edit::Joint,
        Edit::Feature,
        Edit::Claim,
        Edit::Multiplier,
        Edit::StepGone,
        Edit::StepTwice,
        Edit::StepsExchanged,
        Edit::StepMoved,
        Edit::EndEarly,
        Edit::SplitByUnit,
        Edit::Split,
        Edit::SplitVariable,
        Edit::HalvesExchanged,
    ];

    /// What is changed, and why the result may still be a valid proof; `None` if it never is.
    pub fn describe(self) -> (&'static str, Option<&'static str>) {
        match self {
            Edit::Machine => ("machine digest", None),
            Edit::Tip => ("tip name", None),
            Edit::Target => ("number of the target", None),
            Edit::RootNarrower => ("root narrower than the limits", None),
            Edit::RootGone => ("span of the root left out", None),
            Edit::FrameGone => ("frame left out", None),
            Edit::PartGone => ("part left out", None),
            Edit::PartTwice => ("part twice", None),
            Edit::Search => ("search digest", Some("nothing depends on it")),
            Edit::RootWider => ("root wider", Some("covers the limits all the more")),
            Edit::FrameTurn => ("frame's quaternion", Some("another frame on the same axis")),
            Edit::FrameShift => ("frame's shift", Some("steps with room to spare")),
            Edit::BoundByUnit => ("bound by one unit", Some("steps with room to spare")),
            Edit::Bound => (
                "bound",
                Some("a looser bound that suffices, or room to spare"),
            ),
            Edit::Quantity => ("quantity", Some("a bound that follows and is not needed")),
            Edit::Rule => ("rule", Some("two rules that say the same here")),
            Edit::Joint => (
                "joint, link or cone",
                Some("two rules that say the same here"),
            ),
            Edit::Feature => ("feature", Some("two rules that say the same here")),
            Edit::Claim => (
                "kind of claim",
                Some("the half of the claim that is needed"),
            ),
            Edit::Multiplier => (
                "multiplier, or a sum of one",
                Some("a sum that says the same"),
            ),
            Edit::StepGone => ("step left out", Some("the bounds without it suffice")),
            Edit::StepTwice => ("step twice", Some("what held still holds")),
            Edit::StepsExchanged => ("steps exchanged", Some("they do not need each other")),
            Edit::StepMoved => ("step moved", Some("what needs it still comes later")),
            Edit::EndEarly => ("step made the end", Some("it leaves nothing already")),
            Edit::SplitByUnit => ("split by one unit", Some("both parts have room to spare")),
            Edit::Split => ("split elsewhere", Some("both parts have room to spare")),
            Edit::SplitVariable => (
                "variable of a split",
                Some("parts that do not need the split"),
            ),
            Edit::HalvesExchanged => ("halves exchanged", Some("parts alike")),
        }
    }

    /// The proof with this change, or `None` where there is nothing to change.
    pub fn apply(self, proof: &Proof, random: &mut impl Rng) -> Option<Proof> {
        let mut new = proof.clone();
        let items = proof.items.len();
        match self {
            Edit::Machine => {
                new.machine[random.random_range(0..32)] ^= random.random_range(1..=255)
            }
            Edit::Search => new.search[random.random_range(0..32)] ^= random.random_range(1..=255),
            Edit::Tip => new.tip.push('x'),
            Edit::Target => new.target = retargeted(&proof.target, random)?,
            Edit::RootNarrower | Edit::RootWider => {
                let span = random.random_range(0..new.root.len());
                let span = &mut new.root[span];
                // The prover's root is two units outside of the limits.
                let by = 6 + size(random);
                let by = if self == Edit::RootNarrower { by } else { -by };
                if random.random() {
                    span.lo = span.lo.checked_add(by)?;
                } else {
                    span.hi = span.hi.checked_sub(by)?;
                }
            }
            Edit::RootGone => drop(new.root.remove(random.random_range(0..new.root.len()))),
            Edit::FrameGone => drop(new.frames.remove(random.random_range(0..new.frames.len()))),
            Edit::FrameTurn => {
                let frame = random.random_range(0..new.frames.len());
                let part = &mut new.frames[frame].turn[random.random_range(0..4)];
                *part = part.checked_add(by(random))?;
            }
            Edit::FrameShift => {
                let frame = random.random_range(0..new.frames.len());
                let shift = &mut new.frames[frame].shift;
                *shift = shift.checked_add(by(random))?;
            }
            Edit::PartGone | Edit::PartTwice => {
                let part = *parts(&proof.items).choose(random)?;
                if self == Edit::PartGone {
                    new.items.drain(part.0..part.1);
                } else {
                    let copy = proof.items[part.0..part.1].to_vec();
                    new.items.splice(part.1..part.1, copy);
                }
            }
            Edit::StepGone => drop(new.items.remove(random.random_range(0..items))),
            Edit::StepTwice => {
                let item = proof.items[random.random_range(0..items)].clone();
                new.items.insert(random.random_range(0..=items), item);
            }
            Edit::StepsExchanged => {
                let first = random.random_range(0..items.checked_sub(1).filter(|n| *n > 0)?);
                new.items.swap(first, first + 1);
            }
            Edit::StepMoved => {
                let item = new.items.remove(random.random_range(0..items));
                new.items.insert(random.random_range(0..items), item);
            }
            Edit::EndEarly => {
                let index = random.random_range(0..items);
                let end = end_of(&proof.items, index)?;
                let Item::Step(step) = &mut new.items[index] else {
                    return None;
                };
                step.claim = Claim::Nothing;
                new.items.drain(index + 1..end);
            }
            Edit::SplitByUnit | Edit::Split | Edit::SplitVariable => {
                let variables = proof.root.len() as u8;
                let splits = new.items.iter_mut().filter_map(|item| match item {
                    Item::Split { variable, at } => Some((variable, at)),
                    Item::Step(_) => None,
                });
                let mut splits: Vec<_> = splits.collect();
                let chosen = random.random_range(0..splits.len().max(1));
                let (variable, at) = splits.get_mut(chosen)?;
                match self {
                    Edit::SplitByUnit => **at += sign(random),
                    Edit::Split => **at = at.checked_add(by(random))?,
                    _ => **variable = random.random_range(0..=variables + 1),
                }
            }
            Edit::HalvesExchanged => {
                let splits: Vec<usize> = (0..items)
                    .filter(|index| matches!(proof.items[*index], Item::Split { .. }))
                    .collect();
                let first = *splits.choose(random)? + 1;
                let second = end_of(&proof.items, first)?;
                let end = end_of(&proof.items, second)?;
                new.items[first..end].rotate_left(second - first);
            }
            Edit::BoundByUnit
            | Edit::Bound
            | Edit::Quantity
            | Edit::Rule
            | Edit::Joint
            | Edit::Feature
            | Edit::Claim
            | Edit::Multiplier => {
                let index = random.random_range(0..items);
                let Item::Step(step) = &proof.items[index] else {
                    return None;
                };
                new.items[index] = Item::Step(self.step(proof, step, random)?);
            }
        }
        (new != *proof).then_some(new)
    }

    /// The step with this change.
    fn step(self, proof: &Proof, step: &Step, random: &mut impl Rng) -> Option<Step> {
        let mut new = step.clone();
        match self {
            Edit::BoundByUnit | Edit::Bound => {
                let unit = self == Edit::BoundByUnit;
                let by = if unit { sign(random) } else { by(random) };
                match &mut new.claim {
                    Claim::AtLeast(bound) | Claim::AtMost(bound) => {
                        *bound = bound.checked_add(by)?
                    }
                    Claim::Within(span) => {
                        let end = if random.random() {
                            &mut span.lo
                        } else {
                            &mut span.hi
                        };
                        *end = end.checked_add(by)?;
                    }
                    Claim::Nothing => return None,
                }
            }
            Edit::Claim => new.claim = other_claim(step.claim, random),
            Edit::Quantity => {
                let other = proof.items.choose(random)?;
                let Item::Step(other) = other else {
                    return None;
                };
                new.quantity = other.quantity;
            }
            Edit::Multiplier => match &mut new.rule {
                Rule::One(relation) => new.rule = Rule::Sum(vec![(by(random), *relation)]),
                Rule::Sum(list) if !list.is_empty() => {
                    let term = random.random_range(0..list.len());
                    list[term].0 = list[term].0.checked_add(by(random))?;
                }
                _ => return None,
            },
            _ => return reworded(proof, step, |words| self.word(words, random)),
        }
        Some(new)
    }

    /// Changes one word of a rule.
    fn word(self, words: &mut [String], random: &mut impl Rng) -> Option<()> {
        let group = |word: &String| NAMES.iter().find(|names| names.contains(&word.as_str()));
        let places: Vec<usize> = (0..words.len())
            .filter(|place| {
                let (word, next) = (&words[*place], words.get(place + 1));
                match self {
                    Edit::Rule => group(word).is_some(),
                    // A number before a name is a multiplier.
                    Edit::Joint => word.parse::<u8>().is_ok() && next.and_then(group).is_none(),
                    _ => *place > 0 && group(word).is_none() && word.parse::<i64>().is_err(),
                }
            })
            .collect();
        let place = *places.choose(random)?;
        words[place] = match self {
            Edit::Rule => (*group(&words[place])?.choose(random)?).to_owned(),
            Edit::Joint => random.random_range(0..=9).to_string(),
            _ => match random.random_range(0..4) {
                0 => format!("o{}", random.random_range(1..=7)),
                1 => format!("a{}", random.random_range(1..=7)),
                _ => (*["t", "x", "y", "z", "k1"].choose(random)?).to_owned(),
            },
        };
        Some(())
    }
}

/// Names of rules and relations with the same arguments.
const NAMES: [&[&str]; 6] = [
    &[
        "turn.x", "turn.y", "turn.z", "back.x", "back.y", "turn.s", "plane-", "plane+", "height-",
        "height+", "dot", "cross", "slide.x", "slide.y", "slide.z", "out.x", "out.y", "out.z",
        "in.x", "in.y", "in.z", "far", "near", "along", "along.d", "aim", "angle", "sector",
        "spread.k",
    ],
    &[
        "shift.x", "shift.y", "shift.z", "close.x", "close.y", "close.z", "open.x", "open.y",
        "open.z", "rigid", "spread",
    ],
    &["circle", "cone", "cosine", "sine", "angle.c", "tilt"],
    &["pair.s", "pair.z"],
    &["trace"],
    &["length"],
];

/// The step whose rule's words `change` changes, if there is one.
fn reworded(
    proof: &Proof,
    step: &Step,
    change: impl FnOnce(&mut [String]) -> Option<()>,
) -> Option<Step> {
    let mut alone = proof.clone();
    alone.items = vec![Item::Step(Step {
        claim: Claim::Nothing,
        ..step.clone()
    })];
    let whole = text::write(&alone).ok()?;
    let (head, line) = whole.strip_suffix("\nend\n")?.rsplit_once('\n')?;
    let (claim, rule) = line.split_once(" by ")?;
    let mut words: Vec<String> = rule.split(' ').map(str::to_owned).collect();
    change(&mut words)?;
    let changed = format!("{head}\n{claim} by {}\nend\n", words.join(" "));
    match text::read(&changed).ok()?.items.pop()? {
        Item::Step(new) => Some(Step {
            claim: step.claim,
            ..new
        }),
        Item::Split { .. } => None,
    }
}

fn other_claim(claim: Claim, random: &mut impl Rng) -> Claim {
    let (lo, hi) = match claim {
        Claim::AtLeast(bound) | Claim::AtMost(bound) => (bound, bound),
        Claim::Within(span) => (span.lo, span.hi),
        Claim::Nothing => (0, 0),
    };
    match random.random_range(0..4) {
        0 => Claim::AtLeast(lo),
        1 => Claim::AtMost(hi),
        2 => Claim::Within(Span { lo, hi }),
        _ => Claim::Nothing,
    }
}

/// The target's line with another number.
fn retargeted(line: &str, random: &mut impl Rng) -> Option<String> {
    let mut fields: serde_json::Value = serde_json::from_str(line).ok()?;
    let field = *["xyz", "xyz_within", "turn_within", "quat"].choose(random)?;
    let number = match fields.get_mut(field)? {
        serde_json::Value::Array(list) => list.get_mut(random.random_range(0..3))?,
        number => number,
    };
    let by = 10f64.powf(random.random_range(-9.0..0.0));
    *number = serde_json::json!(number.as_f64()? + by);
    Some(fields.to_string())
}

fn sign(random: &mut impl Rng) -> i64 {
    if random.random() { 1 } else { -1 }
}

/// From one unit to one metre, all magnitudes alike.
fn size(random: &mut impl Rng) -> i64 {
    (PICO as f64).powf(random.random_range(0.0..1.0)) as i64
}

fn by(random: &mut impl Rng) -> i64 {
    sign(random) * size(random)
}

/// Where the part of the tree that starts at an item ends.
pub fn end_of(items: &[Item], start: usize) -> Option<usize> {
    let mut open = 1usize;
    for (index, item) in items.iter().enumerate().skip(start) {
        match item {
            Item::Split { .. } => open += 1,
            Item::Step(step) => open -= usize::from(step.claim == Claim::Nothing),
        }
        if open == 0 {
            return Some(index + 1);
        }
    }
    None
}

/// Start and end of the steps of every part that is not split.
fn parts(items: &[Item]) -> Vec<(usize, usize)> {
    let mut start = 0;
    let mut parts = Vec::new();
    for (index, item) in items.iter().enumerate() {
        match item {
            Item::Split { .. } => start = index + 1,
            Item::Step(step) if step.claim == Claim::Nothing => {
                parts.push((start, index + 1));
                start = index + 1;
            }
            Item::Step(_) => {}
        }
    }
    parts
}
