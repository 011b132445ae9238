//! Reads proofs from bytes.

use sha2::{Digest, Sha256};

use super::{DIGEST, MARK, MAX_SIZE, VERSION, after};
use crate::grammar::{self, Malformed, Reader};
use crate::proof::{
    Claim, Feature, Frame, Item, Part, Place, Proof, Quantity, Relation, Rule, Span, Step,
};

const PARTS: [Part; 4] = [Part::X, Part::Y, Part::Z, Part::Square];

/// The proof in `bytes`. Cost: linear; memory grows no faster than what has been read.
///
/// # Errors
///
/// The first thing that [`write`] would not have written.
pub fn read(bytes: &[u8]) -> Result<Proof, Malformed> {
    if bytes.len() > MAX_SIZE {
        return Err(Malformed::Long);
    }
    let Some((body, digest)) = bytes.split_last_chunk::<DIGEST>() else {
        return Err(Malformed::Short);
    };
    let mut from = Cursor(body);
    if from.take(MARK.len())? != MARK || from.byte()? != VERSION {
        return Err(Malformed::Version);
    }
    if Sha256::digest(body).as_slice() != digest {
        return Err(Malformed::Digest);
    }
    let machine = from.digest()?;
    let tip = from.text()?;
    let target = from.text()?;
    grammar::need_target(&target)?;
    let search = from.digest()?;
    let mut frames = Vec::new();
    for _ in 0..from.unsigned()? {
        frames.push(Frame {
            turn: [
                from.signed()?,
                from.signed()?,
                from.signed()?,
                from.signed()?,
            ],
            shift: from.signed()?,
        });
    }
    let mut root = Vec::new();
    for _ in 0..from.unsigned()? {
        root.push(Span {
            lo: from.signed()?,
            hi: from.signed()?,
        });
    }
    let mut items = Vec::new();
    let mut open = 1;
    while open > 0 {
        let item = from.item()?;
        open = after(&item, open);
        items.push(item);
    }
    if !from.0.is_empty() {
        return Err(Malformed::Trailing);
    }
    Ok(Proof {
        machine,
        tip,
        target,
        search,
        frames,
        root,
        items,
    })
}

struct Cursor<'a>(&'a [u8]);

impl<'a> Cursor<'a> {
    fn take(&mut self, length: usize) -> Result<&'a [u8], Malformed> {
        let (head, rest) = self.0.split_at_checked(length).ok_or(Malformed::Short)?;
        self.0 = rest;
        Ok(head)
    }

    fn byte(&mut self) -> Result<u8, Malformed> {
        let (byte, rest) = self.0.split_first().ok_or(Malformed::Short)?;
        self.0 = rest;
        Ok(*byte)
    }

    fn digest(&mut self) -> Result<[u8; DIGEST], Malformed> {
        let (head, rest) = self.0.split_first_chunk().ok_or(Malformed::Short)?;
        self.0 = rest;
        Ok(*head)
    }

    fn unsigned(&mut self) -> Result<u64, Malformed> {
        let mut number = 0u64;
        for place in 0..10 {
            let byte = self.byte()?;
            let bits = u64::from(byte & 0x7f);
            let shifted = bits << (7 * place);
            if shifted >> (7 * place) != bits {
                return Err(Malformed::Number);
            }
            number |= shifted;
            if byte & 0x80 == 0 {
                // Only the number zero may end in a byte of zero.
                return if byte == 0 && place > 0 {
                    Err(Malformed::Number)
                } else {
                    Ok(number)
                };
            }
        }
        Err(Malformed::Number)
    }

    fn signed(&mut self) -> Result<i64, Malformed> {
        let number = self.unsigned()?;
        Ok((number >> 1) as i64 ^ -((number & 1) as i64))
    }

    fn text(&mut self) -> Result<String, Malformed> {
        let length = usize::try_from(self.unsigned()?).map_err(|_| Malformed::Short)?;
        let text = core::str::from_utf8(self.take(length)?).map_err(|_| Malformed::Text)?;
        Ok(text.to_owned())
    }

    fn quantity(&mut self) -> Result<Option<Quantity>, Malformed> {
        Ok(Some(match self.byte()? {
            0 => return Ok(None),
            1 => Quantity::Variable(self.index()?),
            2 => Quantity::Value(self.index()?),
            3 => Quantity::Cosine(self.index()?),
            4 => Quantity::Sine(self.index()?),
            code @ 5..=8 => {
                let part = PARTS[usize::from(code - 5)];
                Quantity::View(self.feature()?, self.place()?, part)
            }
            9 => Quantity::Radius(self.feature()?, self.index()?),
            10 => Quantity::Along(self.feature()?, self.index()?),
            11 => Quantity::Aim(self.feature()?, self.index()?),
            _ => return Err(Malformed::Unknown),
        }))
    }

    fn item(&mut self) -> Result<Item, Malformed> {
        let Some(code) = self.byte()?.checked_sub(1) else {
            return Ok(Item::Split {
                variable: self.index()?,
                at: self.signed()?,
            });
        };
        let rule: Rule = grammar::rule(code / 4, self)?;
        let quantity = self.quantity()?;
        let claim = match code % 4 {
            0 => Claim::AtLeast(self.signed()?),
            1 => Claim::AtMost(self.signed()?),
            2 => {
                let lo = self.signed()?;
                let hi = lo.checked_add_unsigned(self.unsigned()?);
                Claim::Within(Span {
                    lo,
                    hi: hi.ok_or(Malformed::Number)?,
                })
            }
            _ => Claim::Nothing,
        };
        let step = Step {
            rule,
            quantity,
            claim,
        };
        grammar::need_quantity(&step)?;
        Ok(Item::Step(step))
    }
}

/// `number / kinds` counted from 1, in a byte.
fn place_of(number: u64, kinds: u64) -> Result<u8, Malformed> {
    u8::try_from(number / kinds + 1).map_err(|_| Malformed::Number)
}

impl Reader for Cursor<'_> {
    fn index(&mut self) -> Result<u8, Malformed> {
        u8::try_from(self.unsigned()?).map_err(|_| Malformed::Number)
    }

    fn feature(&mut self) -> Result<Feature, Malformed> {
        Ok(match self.unsigned()? {
            0 => Feature::Tip,
            axis @ 1..=3 => Feature::TipAxis(axis as u8 - 1),
            number => {
                let index = place_of(number - 4, 3)?;
                match (number - 4) % 3 {
                    0 => Feature::Origin(index),
                    1 => Feature::Axis(index),
                    _ => Feature::Cone(index),
                }
            }
        })
    }

    fn place(&mut self) -> Result<Place, Malformed> {
        Ok(match self.unsigned()? {
            0 => Place::Base,
            1 => Place::End,
            2 => Place::Difference,
            number => {
                let index = place_of(number - 3, 2)?;
                match (number - 3) % 2 {
                    0 => Place::Before(index),
                    _ => Place::After(index),
                }
            }
        })
    }

    fn rule(&mut self) -> Result<u8, Malformed> {
        self.byte()
    }

    fn list(&mut self) -> Result<Vec<(i64, Relation)>, Malformed> {
        let mut list = Vec::new();
        for _ in 0..self.unsigned()? {
            let multiplier = self.signed()?;
            let number = self.rule()?;
            list.push((multiplier, grammar::relation(number, self)?));
        }
        Ok(list)
    }
}
