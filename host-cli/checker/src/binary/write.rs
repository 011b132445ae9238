//! Writes proofs as bytes.

use sha2::{Digest, Sha256};

use super::{MARK, MAX_SIZE, VERSION, after};
use crate::grammar::{self, Malformed, Writer};
use crate::proof::{Claim, Feature, Item, Place, Proof, Quantity, Span};

/// The bytes of `proof`. Cost: linear.
///
/// # Errors
///
/// What the format cannot hold: a reversed interval, an axis beyond the third, items that go on
/// after the last branch has ended or stop before.
pub fn write(proof: &Proof) -> Result<Vec<u8>, Malformed> {
    grammar::need_target(&proof.target)?;
    let mut to = Bytes(Vec::new());
    to.0.extend_from_slice(MARK);
    to.0.push(VERSION);
    to.0.extend_from_slice(&proof.machine);
    to.text(&proof.tip);
    to.text(&proof.target);
    to.0.extend_from_slice(&proof.search);
    to.count(proof.frames.len());
    for frame in &proof.frames {
        frame.turn.iter().for_each(|part| to.integer(*part));
        to.integer(frame.shift);
    }
    to.count(proof.root.len());
    for span in &proof.root {
        to.integer(span.lo);
        to.integer(span.hi);
    }
    let mut open = 1usize;
    for item in &proof.items {
        if open == 0 {
            return Err(Malformed::Trailing);
        }
        open = after(item, open);
        to.item(item)?;
    }
    if open > 0 {
        return Err(Malformed::Short);
    }
    let digest = Sha256::digest(&to.0);
    to.0.extend_from_slice(&digest);
    if to.0.len() > MAX_SIZE {
        return Err(Malformed::Long);
    }
    Ok(to.0)
}

/// Number of a claim.
fn claim_number(claim: &Claim) -> u8 {
    match claim {
        Claim::AtLeast(_) => 0,
        Claim::AtMost(_) => 1,
        Claim::Within(_) => 2,
        Claim::Nothing => 3,
    }
}

struct Bytes(Vec<u8>);

impl Bytes {
    fn unsigned(&mut self, mut number: u64) {
        while number >= 0x80 {
            self.0.push((number & 0x7f) as u8 | 0x80);
            number >>= 7;
        }
        self.0.push(number as u8);
    }

    fn text(&mut self, text: &str) {
        self.count(text.len());
        self.0.extend_from_slice(text.as_bytes());
    }

    fn quantity(&mut self, quantity: Option<Quantity>) -> Result<(), Malformed> {
        let plain = |to: &mut Self, code: u8, index: u8| {
            to.0.push(code);
            to.index(index);
        };
        match quantity {
            None => self.0.push(0),
            Some(Quantity::Variable(index)) => plain(self, 1, index),
            Some(Quantity::Value(index)) => plain(self, 2, index),
            Some(Quantity::Cosine(index)) => plain(self, 3, index),
            Some(Quantity::Sine(index)) => plain(self, 4, index),
            Some(Quantity::View(feature, place, part)) => {
                self.0.push(5 + part as u8);
                self.feature(feature)?;
                self.place(place)?;
            }
            Some(Quantity::Radius(feature, index)) => {
                self.0.push(9);
                self.feature(feature)?;
                self.index(index);
            }
            Some(Quantity::Along(feature, index)) => {
                self.0.push(10);
                self.feature(feature)?;
                self.index(index);
            }
            Some(Quantity::Aim(feature, index)) => {
                self.0.push(11);
                self.feature(feature)?;
                self.index(index);
            }
        }
        Ok(())
    }

    fn item(&mut self, item: &Item) -> Result<(), Malformed> {
        let step = match item {
            Item::Split { variable, at } => {
                self.0.push(0);
                self.index(*variable);
                self.integer(*at);
                return Ok(());
            }
            Item::Step(step) => step,
        };
        grammar::need_quantity(step)?;
        let number = grammar::rule_number(&step.rule)?;
        self.0.push(1 + 4 * number + claim_number(&step.claim));
        grammar::rule_arguments(&step.rule, self)?;
        self.quantity(step.quantity)?;
        match step.claim {
            Claim::AtLeast(bound) | Claim::AtMost(bound) => self.integer(bound),
            Claim::Within(Span { lo, hi }) => {
                if lo > hi {
                    return Err(Malformed::Reversed);
                }
                self.integer(lo);
                self.unsigned(hi.abs_diff(lo));
            }
            Claim::Nothing => {}
        }
        Ok(())
    }
}

/// Code of the `index`th of `kinds` kinds after the `first` codes, counted from 1.
fn code(first: u64, kinds: u64, kind: u64, index: u8) -> Result<u64, Malformed> {
    let place = u64::from(index).checked_sub(1).ok_or(Malformed::Number)?;
    Ok(first + kinds * place + kind)
}

impl Writer for Bytes {
    fn index(&mut self, index: u8) {
        self.unsigned(u64::from(index));
    }

    fn feature(&mut self, feature: Feature) -> Result<(), Malformed> {
        let number = match feature {
            Feature::Tip => 0,
            Feature::TipAxis(axis) if axis < 3 => 1 + u64::from(axis),
            Feature::TipAxis(_) => return Err(Malformed::Unknown),
            Feature::Origin(index) => code(4, 3, 0, index)?,
            Feature::Axis(index) => code(4, 3, 1, index)?,
            Feature::Cone(index) => code(4, 3, 2, index)?,
        };
        self.unsigned(number);
        Ok(())
    }

    fn place(&mut self, place: Place) -> Result<(), Malformed> {
        let number = match place {
            Place::Base => 0,
            Place::End => 1,
            Place::Difference => 2,
            Place::Before(index) => code(3, 2, 0, index)?,
            Place::After(index) => code(3, 2, 1, index)?,
        };
        self.unsigned(number);
        Ok(())
    }

    fn rule(&mut self, number: u8) {
        self.0.push(number);
    }

    fn count(&mut self, count: usize) {
        self.unsigned(count as u64);
    }

    fn integer(&mut self, number: i64) {
        self.unsigned(((number << 1) ^ (number >> 63)) as u64);
    }
}
