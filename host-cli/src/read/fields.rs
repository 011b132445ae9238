//! A tree of named fields that remembers lines and paths, filled from TOML or from JSON.

use std::fmt;

use nalgebra::Vector3;
use serde::de::{Deserialize, Deserializer, Error as _, MapAccess, SeqAccess, Visitor};
use toml::de::{DeTable, DeValue};

use super::Flaw;

/// A value with the place it was read from.
#[derive(Debug)]
pub(super) struct Field {
    line: usize,
    path: String,
    value: Value,
}

/// A value without its place; tables and lists hold the line of each item.
#[derive(Debug)]
pub(super) enum Value {
    List(Vec<(usize, Value)>),
    Number(f64),
    Other(&'static str),
    Table(Vec<(String, usize, Value)>),
    Text(String),
}

impl Value {
    fn kind(&self) -> &'static str {
        match self {
            Value::List(_) => "a list",
            Value::Number(_) => "a number",
            Value::Other(kind) => kind,
            Value::Table(_) => "a table",
            Value::Text(_) => "a text",
        }
    }
}

impl Field {
    /// The complaint `reason` about this field.
    pub fn flaw(&self, reason: impl Into<String>) -> Flaw {
        Flaw { line: Some(self.line), field: self.path.clone(), reason: reason.into() }
    }

    /// The path of this field in its file.
    pub fn path(&self) -> &str {
        &self.path
    }

    fn expected(&self, what: &str) -> Flaw {
        self.flaw(format!("expected {what}, found {}", self.value.kind()))
    }

    /// The items of a list.
    pub fn list(self) -> Result<Vec<Field>, Flaw> {
        let Value::List(items) = self.value else { return Err(self.expected("a list")) };
        let path = &self.path;
        Ok(items
            .into_iter()
            .enumerate()
            .map(|(k, (line, value))| Field { line, path: format!("{path}[{k}]"), value })
            .collect())
    }

    /// The items of a list of at least one and at most `max`; `what` names them in complaints.
    pub fn bounded(self, max: usize, what: &str) -> Result<Vec<Field>, Flaw> {
        let place = self.flaw("");
        let items = self.list()?;
        match items.len() {
            0 => Err(Flaw { reason: format!("has no {what}"), ..place }),
            n if n > max => Err(Flaw { reason: format!("has {n} {what}, more than {max}"), ..place }),
            _ => Ok(items),
        }
    }

    /// The items of a list of `N`.
    pub fn list_of<const N: usize>(self) -> Result<[Field; N], Flaw> {
        let place = self.flaw("");
        self.list()?.try_into().map_err(|items: Vec<Field>| Flaw {
            reason: format!("expected {N} items, found {}", items.len()),
            ..place
        })
    }

    /// A finite number.
    pub fn number(&self) -> Result<f64, Flaw> {
        match self.value {
            Value::Number(x) if x.is_finite() => Ok(x),
            Value::Number(x) => Err(self.flaw(format!("{x} is not a finite number"))),
            _ => Err(self.expected("a number")),
        }
    }

    /// A finite number that is not negative.
    pub fn not_negative(&self) -> Result<f64, Flaw> {
        match self.number()? {
            x if x < 0.0 => Err(self.flaw(format!("{x} is negative"))),
            x => Ok(x),
        }
    }

    /// A list of `N` finite numbers.
    pub fn numbers<const N: usize>(self) -> Result<[f64; N], Flaw> {
        let mut numbers = [0.0; N];
        for (number, item) in numbers.iter_mut().zip(self.list_of::<N>()?) {
            *number = item.number()?;
        }
        Ok(numbers)
    }

    /// Three finite numbers.
    pub fn vector(self) -> Result<Vector3<f64>, Flaw> {
        Ok(Vector3::from(self.numbers::<3>()?))
    }

    /// The text under `key`, if this is a table that has one.
    pub fn peek(&self, key: &str) -> Option<&str> {
        let Value::Table(entries) = &self.value else { return None };
        entries.iter().find_map(|(name, _, value)| match value {
            Value::Text(text) if name == key => Some(text.as_str()),
            _ => None,
        })
    }

    /// Whether the value is a list.
    pub fn is_list(&self) -> bool {
        matches!(self.value, Value::List(_))
    }

    /// The fields of a table, all of them among `known`.
    pub fn table(self, known: &[&str]) -> Result<Fields, Flaw> {
        let Value::Table(entries) = self.value else { return Err(self.expected("a table")) };
        let fields = Fields { line: self.line, path: self.path, entries };
        let stranger = fields.entries.iter().find(|(key, ..)| !known.contains(&key.as_str()));
        match stranger {
            None => Ok(fields),
            Some((key, line, _)) => Err(Flaw {
                line: Some(*line),
                field: fields.path_of(key),
                reason: format!("unknown field; known here: {}", known.join(", ")),
            }),
        }
    }

    /// A text that can serve as a name: not empty, no control characters.
    pub fn name(&self) -> Result<String, Flaw> {
        match self.text()? {
            "" => Err(self.flaw("a name cannot be empty")),
            text if text.chars().any(char::is_control) => {
                Err(self.flaw("a name cannot hold control characters"))
            }
            text => Ok(text.to_owned()),
        }
    }

    /// A text.
    pub fn text(&self) -> Result<&str, Flaw> {
        match &self.value {
            Value::Text(text) => Ok(text),
            _ => Err(self.expected("a text")),
        }
    }

    /// One of the words in `choices`; returns what stands beside it.
    pub fn choice<T: Copy>(&self, choices: &[(&str, T)]) -> Result<T, Flaw> {
        let text = self.text()?;
        choices.iter().find(|(word, _)| *word == text).map(|(_, value)| *value).ok_or_else(|| {
            let words: Vec<&str> = choices.iter().map(|(word, _)| *word).collect();
            self.flaw(format!("{text:?} is not one of {}", words.join(", ")))
        })
    }
}

/// The fields of one table, to be taken one by one.
#[derive(Debug)]
pub(super) struct Fields {
    line: usize,
    path: String,
    entries: Vec<(String, usize, Value)>,
}

impl Fields {
    /// The complaint that `key` has `reason`, on the line of the table.
    pub fn flaw(&self, key: &str, reason: impl Into<String>) -> Flaw {
        Flaw { line: Some(self.line), field: self.path_of(key), reason: reason.into() }
    }

    fn path_of(&self, key: &str) -> String {
        if self.path.is_empty() { key.to_owned() } else { format!("{}.{key}", self.path) }
    }

    /// Takes the field `key` if it is there.
    pub fn take(&mut self, key: &str) -> Option<Field> {
        let at = self.entries.iter().position(|(name, ..)| name == key)?;
        let (_, line, value) = self.entries.swap_remove(at);
        Some(Field { line, path: self.path_of(key), value })
    }

    /// Takes the field `key`, which must be there.
    pub fn need(&mut self, key: &str) -> Result<Field, Flaw> {
        self.take(key).ok_or_else(|| self.flaw(key, "missing"))
    }

    /// Takes the one field of `keys` that is there, with its place in `keys`.
    pub fn one_of(&mut self, keys: &[&str]) -> Result<Option<(usize, Field)>, Flaw> {
        let mut found: Option<(usize, Field)> = None;
        for (place, key) in keys.iter().enumerate() {
            let Some(field) = self.take(key) else { continue };
            if let Some((first, _)) = found {
                return Err(field.flaw(format!("cannot be given together with {}", keys[first])));
            }
            found = Some((place, field));
        }
        Ok(found)
    }

    /// The angle written as `key` (radians) or `key_deg` (degrees), in radians.
    pub fn angle(&mut self, key: &str) -> Result<Option<(f64, Field)>, Flaw> {
        let in_degrees = format!("{key}_deg");
        match self.one_of(&[key, &in_degrees])? {
            None => Ok(None),
            Some((0, field)) => Ok(Some((field.number()?, field))),
            Some((_, field)) => Ok(Some((field.number()?.to_radians(), field))),
        }
    }
}

/// The root of a TOML document.
pub(super) fn from_toml(text: &str) -> Result<Field, Flaw> {
    let line_starts: Vec<usize> =
        std::iter::once(0).chain(text.match_indices('\n').map(|(at, _)| at + 1)).collect();
    let line_of = |at: usize| line_starts.partition_point(|start| *start <= at);
    let root = DeTable::parse(text).map_err(|error| Flaw {
        line: error.span().map(|span| line_of(span.start)),
        field: String::new(),
        reason: error.message().replace('\n', ", "),
    })?;
    let value = toml_table(root.get_ref(), &line_of);
    Ok(Field { line: 1, path: String::new(), value })
}

fn toml_table(table: &DeTable<'_>, line_of: &impl Fn(usize) -> usize) -> Value {
    let mut entries: Vec<_> = table.iter().collect();
    entries.sort_by_key(|(key, _)| key.span().start);
    Value::Table(
        entries
            .into_iter()
            .map(|(key, value)| {
                let line = line_of(key.span().start);
                (key.get_ref().to_string(), line, toml_value(value.get_ref(), line_of))
            })
            .collect(),
    )
}

fn toml_value(value: &DeValue<'_>, line_of: &impl Fn(usize) -> usize) -> Value {
    match value {
        DeValue::Array(items) => Value::List(
            items
                .iter()
                .map(|item| (line_of(item.span().start), toml_value(item.get_ref(), line_of)))
                .collect(),
        ),
        DeValue::Boolean(_) => Value::Other("a truth value"),
        DeValue::Datetime(_) => Value::Other("a date"),
        DeValue::Float(x) => x.as_str().parse().map_or(Value::Other("a malformed number"), Value::Number),
        DeValue::Integer(x) => i64::from_str_radix(x.as_str(), x.radix())
            .map_or(Value::Other("an integer beyond 64 bits"), |x| Value::Number(x as f64)),
        DeValue::String(text) => Value::Text(text.to_string()),
        DeValue::Table(table) => toml_table(table, line_of),
    }
}

/// The root of one JSON text that stands on line `line`.
pub(super) fn from_json(text: &str, line: usize) -> Result<Field, Flaw> {
    let value: JsonValue = serde_json::from_str(text).map_err(|error| {
        let field = key_before(text, error.column()).unwrap_or_default().to_owned();
        let word = word_at(text, error.column());
        let message = error.to_string();
        let reason = match message.split(" at line ").next().unwrap_or_default() {
            "number out of range" => format!("{word} is not a finite number"),
            _ if NOT_FINITE.contains(&word) => format!("{word} is not a finite number"),
            reason => format!("not a JSON object: {reason} (column {})", error.column()),
        };
        Flaw { line: Some(line), field, reason }
    })?;
    Ok(Field { line, path: String::new(), value: on_line(value.0, line) })
}

/// Words that other programs write for numbers JSON does not have.
const NOT_FINITE: [&str; 8] =
    ["NaN", "nan", "Infinity", "-Infinity", "inf", "-inf", "Inf", "-Inf"];

/// The word or number around column `column` (from 1) of `text`.
fn word_at(text: &str, column: usize) -> &str {
    let part_of_word = |c: &u8| c.is_ascii_alphanumeric() || b"+-._".contains(c);
    let bytes = text.as_bytes();
    let at = column.saturating_sub(1).min(bytes.len());
    let before = bytes[..at].iter().rev().take_while(|c| part_of_word(c)).count();
    let after = bytes[at..].iter().take_while(|c| part_of_word(c)).count();
    &text[at - before..at + after]
}

/// The last key of `text` before column `column` (from 1).
fn key_before(text: &str, column: usize) -> Option<&str> {
    let (before, _) = text.get(..column.min(text.len()))?.rsplit_once("\":")?;
    before.rsplit_once('"').map(|(_, key)| key)
}

/// Sets every line in `value` to `line`: a JSON text of this program stands on one line.
fn on_line(value: Value, line: usize) -> Value {
    match value {
        Value::List(items) => {
            Value::List(items.into_iter().map(|(_, item)| (line, on_line(item, line))).collect())
        }
        Value::Table(entries) => Value::Table(
            entries.into_iter().map(|(key, _, item)| (key, line, on_line(item, line))).collect(),
        ),
        leaf => leaf,
    }
}

/// A [`Value`] read from JSON, its lines not yet set; a repeated key is an error.
struct JsonValue(Value);

impl<'de> Deserialize<'de> for JsonValue {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        deserializer.deserialize_any(JsonVisitor).map(JsonValue)
    }
}

struct JsonVisitor;

impl<'de> Visitor<'de> for JsonVisitor {
    type Value = Value;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a JSON value")
    }

    fn visit_bool<E>(self, _: bool) -> Result<Value, E> {
        Ok(Value::Other("a truth value"))
    }

    fn visit_f64<E>(self, x: f64) -> Result<Value, E> {
        Ok(Value::Number(x))
    }

    fn visit_i64<E>(self, x: i64) -> Result<Value, E> {
        Ok(Value::Number(x as f64))
    }

    fn visit_u64<E>(self, x: u64) -> Result<Value, E> {
        Ok(Value::Number(x as f64))
    }

    fn visit_str<E>(self, text: &str) -> Result<Value, E> {
        Ok(Value::Text(text.to_owned()))
    }

    fn visit_unit<E>(self) -> Result<Value, E> {
        Ok(Value::Other("null"))
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut items: A) -> Result<Value, A::Error> {
        let mut list = Vec::new();
        while let Some(JsonValue(item)) = items.next_element()? {
            list.push((0, item));
        }
        Ok(Value::List(list))
    }

    fn visit_map<A: MapAccess<'de>>(self, mut entries: A) -> Result<Value, A::Error> {
        let mut table: Vec<(String, usize, Value)> = Vec::new();
        while let Some((key, JsonValue(value))) = entries.next_entry::<String, _>()? {
            if table.iter().any(|(known, ..)| *known == key) {
                return Err(A::Error::custom(format!("field {key:?} is given twice")));
            }
            table.push((key, 0, value));
        }
        Ok(Value::Table(table))
    }
}
