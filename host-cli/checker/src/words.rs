//! Numbers, features, places and quantities as words: `FORMAT.md`, sections 3 and 7.

use dashu_int::IBig;

use crate::exact::interval::{Interval, ONE, ceil, floor};
use crate::grammar::Malformed;
use crate::proof::{Feature, PICO, Part, Pico, Place, Quantity};

/// A number of a proof's grid with as few places as it needs.
pub fn decimal(number: Pico) -> String {
    let (whole, part) = (
        number.unsigned_abs() / PICO as u64,
        number.unsigned_abs() % PICO as u64,
    );
    let sign = if number < 0 { "-" } else { "" };
    let digits = format!("{part:012}");
    match digits.trim_end_matches('0') {
        "" => format!("{sign}{whole}"),
        digits => format!("{sign}{whole}.{digits}"),
    }
}

/// A decimal with at most 12 places.
pub fn parse_decimal(word: &str) -> Result<Pico, Malformed> {
    let (negative, digits) = match word.strip_prefix('-') {
        Some(digits) => (true, digits),
        None => (false, word),
    };
    let (whole, part) = digits.split_once('.').unwrap_or((digits, "0"));
    let all_digits = |text: &str| !text.is_empty() && text.bytes().all(|b| b.is_ascii_digit());
    if !all_digits(whole) || !all_digits(part) || whole.len() > 20 || part.len() > 12 {
        return Err(Malformed::Number);
    }
    // At most 32 digits, which an i128 holds.
    let number: i128 = format!("{whole}{part:0<12}")
        .parse()
        .map_err(|_| Malformed::Number)?;
    i64::try_from(if negative { -number } else { number }).map_err(|_| Malformed::Number)
}

/// An interval of grains, ends moved outward to 15 places.
pub fn interval(range: &Interval) -> String {
    if range.is_empty() {
        return "none".to_owned();
    }
    let step = IBig::from(1_000_000_000u32);
    let one = &ONE / &step;
    let written = |number: IBig| {
        let whole = number.clone().max(-&number);
        let sign = if number < IBig::ZERO { "-" } else { "" };
        let (units, part) = (&whole / &one, (&whole % &one).to_string());
        let digits = format!("{part:0>15}");
        let digits = digits.trim_end_matches('0');
        let point = if digits.is_empty() { "" } else { "." };
        format!("{sign}{units}{point}{digits}")
    };
    let (lo, hi) = (floor(&range.lo, &step), ceil(&range.hi, &step));
    format!("in [{}, {}]", written(lo), written(hi))
}

/// A feature.
pub fn feature(feature: Feature) -> Result<String, Malformed> {
    Ok(match feature {
        Feature::Origin(index) => format!("o{index}"),
        Feature::Axis(index) => format!("a{index}"),
        Feature::Tip => "t".to_owned(),
        Feature::TipAxis(axis) => {
            let name = ["x", "y", "z"].get(usize::from(axis));
            (*name.ok_or(Malformed::Unknown)?).to_owned()
        }
        Feature::Cone(index) => format!("k{index}"),
    })
}

/// A feature's word.
pub fn parse_feature(word: &str) -> Result<Feature, Malformed> {
    Ok(match word {
        "t" => Feature::Tip,
        "x" => Feature::TipAxis(0),
        "y" => Feature::TipAxis(1),
        "z" => Feature::TipAxis(2),
        _ => match split_first(word)? {
            ('o', index) => Feature::Origin(parse_ordinal(index)?),
            ('a', index) => Feature::Axis(parse_ordinal(index)?),
            ('k', index) => Feature::Cone(parse_ordinal(index)?),
            _ => return Err(Malformed::Unknown),
        },
    })
}

/// A place.
pub fn place(place: Place) -> String {
    match place {
        Place::Base => "b".to_owned(),
        Place::Before(index) => format!("{index}-"),
        Place::After(index) => format!("{index}+"),
        Place::End => "e".to_owned(),
        Place::Difference => "d".to_owned(),
    }
}

/// A place's word.
pub fn parse_place(word: &str) -> Result<Place, Malformed> {
    Ok(match word {
        "b" => Place::Base,
        "e" => Place::End,
        "d" => Place::Difference,
        _ => match (word.strip_suffix('-'), word.strip_suffix('+')) {
            (Some(index), _) => Place::Before(parse_ordinal(index)?),
            (_, Some(index)) => Place::After(parse_ordinal(index)?),
            _ => return Err(Malformed::Unknown),
        },
    })
}

/// A quantity.
pub fn quantity(quantity: Quantity) -> Result<String, Malformed> {
    Ok(match quantity {
        Quantity::Variable(index) => format!("u{index}"),
        Quantity::Value(index) => format!("q{index}"),
        Quantity::Cosine(index) => format!("c{index}"),
        Quantity::Sine(index) => format!("s{index}"),
        Quantity::View(of, from, part) => {
            let part = match part {
                Part::X => "x",
                Part::Y => "y",
                Part::Z => "z",
                Part::Square => "s",
            };
            format!("{}@{}.{part}", feature(of)?, place(from))
        }
        Quantity::Radius(of, index) => format!("{}@{index}.r", feature(of)?),
        Quantity::Along(of, index) => format!("{}.p{index}", feature(of)?),
        Quantity::Aim(of, index) => format!("{}.g{index}", feature(of)?),
    })
}

/// A quantity's word.
pub fn parse_quantity(word: &str) -> Result<Quantity, Malformed> {
    if let Some((of, rest)) = word.split_once('@') {
        let of = parse_feature(of)?;
        let (from, part) = rest.rsplit_once('.').ok_or(Malformed::Unknown)?;
        let part = match part {
            "x" => Part::X,
            "y" => Part::Y,
            "z" => Part::Z,
            "s" => Part::Square,
            "r" => return Ok(Quantity::Radius(of, parse_ordinal(from)?)),
            _ => return Err(Malformed::Unknown),
        };
        return Ok(Quantity::View(of, parse_place(from)?, part));
    }
    if let Some((of, rest)) = word.split_once('.') {
        let of = parse_feature(of)?;
        return match split_first(rest)? {
            ('p', index) => Ok(Quantity::Along(of, parse_ordinal(index)?)),
            ('g', index) => Ok(Quantity::Aim(of, parse_ordinal(index)?)),
            _ => Err(Malformed::Unknown),
        };
    }
    match split_first(word)? {
        ('u', index) => Ok(Quantity::Variable(parse_ordinal(index)?)),
        ('q', index) => Ok(Quantity::Value(parse_ordinal(index)?)),
        ('c', index) => Ok(Quantity::Cosine(parse_ordinal(index)?)),
        ('s', index) => Ok(Quantity::Sine(parse_ordinal(index)?)),
        _ => Err(Malformed::Unknown),
    }
}

/// A number from 0 without needless zeros.
pub fn parse_index(word: &str) -> Result<u8, Malformed> {
    if !word.bytes().all(|byte| byte.is_ascii_digit()) || (word.len() > 1 && word.starts_with('0'))
    {
        return Err(Malformed::Number);
    }
    word.parse().map_err(|_| Malformed::Number)
}

fn parse_ordinal(word: &str) -> Result<u8, Malformed> {
    match parse_index(word)? {
        0 => Err(Malformed::Number),
        index => Ok(index),
    }
}

fn split_first(word: &str) -> Result<(char, &str), Malformed> {
    let mut rest = word.chars();
    let first = rest.next().ok_or(Malformed::Unknown)?;
    Ok((first, rest.as_str()))
}
