//! Proofs as text: `FORMAT.md`, section 7.

use crate::grammar::{self, Malformed, NAMES, Reader, Writer};
use crate::proof::{
    Claim, Feature, Frame, Item, Place, Proof, Quantity, Relation, Rule, Span, Step,
};
use crate::words;

pub(crate) use words::interval;

/// First line of a proof.
const TITLE: &str = "balk-proof 1";
/// Longest text, bytes.
const MAX_SIZE: usize = 256 << 20;

/// Where and why a text is no proof.
#[derive(Clone, Copy, Debug, PartialEq, Eq, thiserror::Error)]
#[error("line {line}: {reason}")]
pub struct TextError {
    /// Counted from 1; one more than there are if something is missing at the end.
    pub line: usize,
    /// What is wrong.
    pub reason: Malformed,
}

/// The text of `proof`. Cost: linear.
///
/// # Errors
///
/// What the format cannot hold, such as a target with a line break or an axis beyond the third.
pub fn write(proof: &Proof) -> Result<String, Malformed> {
    grammar::need_target(&proof.target)?;
    let mut lines = vec![
        TITLE.to_owned(),
        format!("machine {}", hex(&proof.machine)),
        format!("tip {}", serde_json::Value::from(proof.tip.as_str())),
        format!("target {}", proof.target),
        format!("search {}", hex(&proof.search)),
    ];
    for (place, frame) in proof.frames.iter().enumerate() {
        let [w, x, y, z] = frame.turn;
        let shift = words::decimal(frame.shift);
        lines.push(format!("frame {} {w} {x} {y} {z} {shift}", place + 1));
    }
    for (place, span) in proof.root.iter().enumerate() {
        let (lo, hi) = (words::decimal(span.lo), words::decimal(span.hi));
        lines.push(format!("root {} {lo} {hi}", place + 1));
    }
    for item in &proof.items {
        lines.push(write_item(item)?);
    }
    lines.push("end\n".to_owned());
    Ok(lines.join("\n"))
}

/// One item as text; what is wrong with it if it cannot be written.
pub fn item(item: &Item) -> String {
    write_item(item).unwrap_or_else(|error| error.to_string())
}

fn write_item(item: &Item) -> Result<String, Malformed> {
    let step = match item {
        Item::Split { variable, at } => {
            return Ok(format!("split {variable} at {}", words::decimal(*at)));
        }
        Item::Step(step) => step,
    };
    grammar::need_quantity(step)?;
    let quantity = step.quantity.map_or(Ok("*".to_owned()), words::quantity)?;
    let claim = match step.claim {
        Claim::AtLeast(lo) => format!(">= {}", words::decimal(lo)),
        Claim::AtMost(hi) => format!("<= {}", words::decimal(hi)),
        Claim::Within(Span { lo, hi }) => {
            format!("in [{}, {}]", words::decimal(lo), words::decimal(hi))
        }
        Claim::Nothing => "none".to_owned(),
    };
    let mut line = Line(format!("step {quantity} {claim} by"));
    line.rule(grammar::rule_number(&step.rule)?);
    grammar::rule_arguments(&step.rule, &mut line)?;
    Ok(line.0)
}

fn hex(bytes: &[u8]) -> String {
    bytes.iter().map(|byte| format!("{byte:02x}")).collect()
}

struct Line(String);

impl Line {
    fn word(&mut self, word: &str) {
        self.0.push(' ');
        self.0.push_str(word);
    }
}

impl Writer for Line {
    fn index(&mut self, index: u8) {
        self.word(&index.to_string());
    }

    fn feature(&mut self, feature: Feature) -> Result<(), Malformed> {
        self.word(&words::feature(feature)?);
        Ok(())
    }

    fn place(&mut self, place: Place) -> Result<(), Malformed> {
        self.word(&words::place(place));
        Ok(())
    }

    fn rule(&mut self, number: u8) {
        // Every number that `grammar` gives has a name.
        self.word(NAMES.get(usize::from(number)).copied().unwrap_or("?"));
    }

    fn count(&mut self, _: usize) {}

    fn integer(&mut self, number: i64) {
        self.word(&number.to_string());
    }
}

/// The proof that `text` writes. Cost: linear.
///
/// # Errors
///
/// The first line that is not well written. Whether the items close their tree is not looked at.
pub fn read(text: &str) -> Result<Proof, TextError> {
    if text.len() > MAX_SIZE {
        return Err(TextError {
            line: 1,
            reason: Malformed::Long,
        });
    }
    let mut lines = Lines {
        rest: text.lines(),
        number: 0,
    };
    let proof = read_lines(&mut lines);
    proof.map_err(|reason| TextError {
        line: lines.number,
        reason,
    })
}

/// Lines that hold anything but comments.
struct Lines<'a> {
    rest: core::str::Lines<'a>,
    number: usize,
}

impl<'a> Lines<'a> {
    fn next(&mut self) -> Result<&'a str, Malformed> {
        loop {
            self.number += 1;
            let line = without_comment(self.rest.next().ok_or(Malformed::Short)?);
            if !line.trim().is_empty() {
                return Ok(line);
            }
        }
    }

    /// What follows `word` and a blank on the next line.
    fn after(&mut self, word: &str) -> Result<&'a str, Malformed> {
        let rest = self.next()?.strip_prefix(word);
        rest.and_then(|rest| rest.strip_prefix(' '))
            .ok_or(Malformed::Unknown)
    }
}

/// `line` up to a `#` outside of a JSON string.
fn without_comment(line: &str) -> &str {
    let (mut inside, mut escaped) = (false, false);
    for (place, character) in line.char_indices() {
        match character {
            _ if escaped => escaped = false,
            '\\' if inside => escaped = true,
            '"' => inside = !inside,
            '#' if !inside => return line[..place].trim_end(),
            _ => {}
        }
    }
    line
}

fn read_lines(lines: &mut Lines) -> Result<Proof, Malformed> {
    if lines.next()?.trim() != TITLE {
        return Err(Malformed::Version);
    }
    let machine = parse_digest(lines.after("machine")?)?;
    let tip = serde_json::from_str(lines.after("tip")?).map_err(|_| Malformed::Text)?;
    let target = lines.after("target")?.to_owned();
    grammar::need_target(&target)?;
    let search = parse_digest(lines.after("search")?)?;
    let (mut frames, mut root, mut items) = (Vec::new(), Vec::new(), Vec::new());
    loop {
        let line = lines.next()?;
        let mut words = Words(line.split_whitespace());
        match words.next()? {
            "frame" if root.is_empty() && items.is_empty() => {
                words.expect(&(frames.len() + 1).to_string())?;
                let mut turn = [0; 4];
                for part in &mut turn {
                    *part = words.integer()?;
                }
                let shift = words.decimal()?;
                frames.push(Frame { turn, shift });
            }
            "root" if items.is_empty() => {
                words.expect(&(root.len() + 1).to_string())?;
                root.push(Span {
                    lo: words.decimal()?,
                    hi: words.decimal()?,
                });
            }
            "split" => {
                let variable = words.index()?;
                words.expect("at")?;
                let at = words.decimal()?;
                items.push(Item::Split { variable, at });
            }
            "step" => items.push(Item::Step(words.step()?)),
            "end" => {
                words.finish()?;
                break;
            }
            _ => return Err(Malformed::Unknown),
        }
        words.finish()?;
    }
    match lines.next() {
        Err(Malformed::Short) => {}
        _ => return Err(Malformed::Trailing),
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

fn parse_digest(text: &str) -> Result<[u8; 32], Malformed> {
    let text = text.trim().as_bytes();
    let digit = |byte: u8| match byte {
        b'0'..=b'9' => Ok(byte - b'0'),
        b'a'..=b'f' => Ok(byte - b'a' + 10),
        _ => Err(Malformed::Number),
    };
    let mut digest = [0; 32];
    if text.len() != 2 * digest.len() {
        return Err(Malformed::Number);
    }
    for (byte, pair) in digest.iter_mut().zip(text.chunks_exact(2)) {
        *byte = 16 * digit(pair[0])? + digit(pair[1])?;
    }
    Ok(digest)
}

struct Words<'a>(core::str::SplitWhitespace<'a>);

impl<'a> Words<'a> {
    fn next(&mut self) -> Result<&'a str, Malformed> {
        self.0.next().ok_or(Malformed::Short)
    }

    fn expect(&mut self, word: &str) -> Result<(), Malformed> {
        if self.next()? == word {
            Ok(())
        } else {
            Err(Malformed::Unknown)
        }
    }

    fn finish(&mut self) -> Result<(), Malformed> {
        match self.0.next() {
            Some(_) => Err(Malformed::Trailing),
            None => Ok(()),
        }
    }

    fn decimal(&mut self) -> Result<i64, Malformed> {
        words::parse_decimal(self.next()?)
    }

    fn integer(&mut self) -> Result<i64, Malformed> {
        self.next()?.parse().map_err(|_| Malformed::Number)
    }

    fn step(&mut self) -> Result<Step, Malformed> {
        let quantity: Option<Quantity> = match self.next()? {
            "*" => None,
            word => Some(words::parse_quantity(word)?),
        };
        let claim = match self.next()? {
            ">=" => Claim::AtLeast(self.decimal()?),
            "<=" => Claim::AtMost(self.decimal()?),
            "in" => {
                let bracket = |word: Option<&'a str>| word.ok_or(Malformed::Unknown);
                let lo = bracket(self.next()?.strip_prefix('['))?;
                let lo = words::parse_decimal(bracket(lo.strip_suffix(','))?)?;
                let hi = words::parse_decimal(bracket(self.next()?.strip_suffix(']'))?)?;
                if lo > hi {
                    return Err(Malformed::Reversed);
                }
                Claim::Within(Span { lo, hi })
            }
            "none" => Claim::Nothing,
            _ => return Err(Malformed::Unknown),
        };
        self.expect("by")?;
        let number = Reader::rule(self)?;
        let rule: Rule = grammar::rule(number, self)?;
        let step = Step {
            rule,
            quantity,
            claim,
        };
        grammar::need_quantity(&step)?;
        Ok(step)
    }
}

impl Reader for Words<'_> {
    fn index(&mut self) -> Result<u8, Malformed> {
        words::parse_index(self.next()?)
    }

    fn feature(&mut self) -> Result<Feature, Malformed> {
        words::parse_feature(self.next()?)
    }

    fn place(&mut self) -> Result<Place, Malformed> {
        words::parse_place(self.next()?)
    }

    fn rule(&mut self) -> Result<u8, Malformed> {
        let word = self.next()?;
        let place = NAMES.iter().position(|name| *name == word);
        place
            .and_then(|place| u8::try_from(place).ok())
            .ok_or(Malformed::Unknown)
    }

    fn list(&mut self) -> Result<Vec<(i64, Relation)>, Malformed> {
        let mut list = Vec::new();
        while self.0.clone().next().is_some() {
            let multiplier = self.integer()?;
            let number = Reader::rule(self)?;
            list.push((multiplier, grammar::relation(number, self)?));
        }
        Ok(list)
    }
}
