//! The tree of values that a TOML document or a line of JSON holds, with lines.

use std::fmt;

use serde::de::{Deserialize, Deserializer, Error as _, MapAccess, SeqAccess, Visitor};
use toml::de::{DeTable, DeValue};

use super::Flaw;
use super::fields::Field;

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
    /// What a complaint calls it.
    pub fn kind(&self) -> &'static str {
        match self {
            Value::List(_) => "a list",
            Value::Number(_) => "a number",
            Value::Other(kind) => kind,
            Value::Table(_) => "a table",
            Value::Text(_) => "a text",
        }
    }
}

/// The root of a TOML document.
pub(super) fn from_toml(text: &str) -> Result<Field, Flaw> {
    let line_starts: Vec<usize> = std::iter::once(0)
        .chain(text.match_indices('\n').map(|(at, _)| at + 1))
        .collect();
    let line_of = |at: usize| line_starts.partition_point(|start| *start <= at);
    let root = DeTable::parse(text).map_err(|error| Flaw {
        line: error.span().map(|span| line_of(span.start)),
        field: String::new(),
        reason: error.message().replace('\n', ", "),
    })?;
    let value = toml_table(root.get_ref(), &line_of);
    Ok(Field::root(1, value))
}

fn toml_table(table: &DeTable<'_>, line_of: &impl Fn(usize) -> usize) -> Value {
    let mut entries: Vec<_> = table.iter().collect();
    entries.sort_by_key(|(key, _)| key.span().start);
    Value::Table(
        entries
            .into_iter()
            .map(|(key, value)| {
                let line = line_of(key.span().start);
                (
                    key.get_ref().to_string(),
                    line,
                    toml_value(value.get_ref(), line_of),
                )
            })
            .collect(),
    )
}

fn toml_value(value: &DeValue<'_>, line_of: &impl Fn(usize) -> usize) -> Value {
    match value {
        DeValue::Array(items) => Value::List(
            items
                .iter()
                .map(|item| {
                    (
                        line_of(item.span().start),
                        toml_value(item.get_ref(), line_of),
                    )
                })
                .collect(),
        ),
        DeValue::Boolean(_) => Value::Other("a truth value"),
        DeValue::Datetime(_) => Value::Other("a date"),
        DeValue::Float(x) => x
            .as_str()
            .parse()
            .map_or(Value::Other("a malformed number"), Value::Number),
        DeValue::Integer(x) => i64::from_str_radix(x.as_str(), x.radix())
            .map_or(Value::Other("an integer beyond 64 bits"), |x| {
                Value::Number(x as f64)
            }),
        DeValue::String(text) => Value::Text(text.to_string()),
        DeValue::Table(table) => toml_table(table, line_of),
    }
}

/// The root of one JSON text that stands on line `line`.
pub(super) fn from_json(text: &str, line: usize) -> Result<Field, Flaw> {
    let value: JsonValue = serde_json::from_str(text).map_err(|error| {
        let field = key_before(text, error.column())
            .unwrap_or_default()
            .to_owned();
        let word = word_at(text, error.column());
        let message = error.to_string();
        let reason = match message.split(" at line ").next().unwrap_or_default() {
            "number out of range" => format!("{word} is not a finite number"),
            _ if NOT_FINITE.contains(&word) => format!("{word} is not a finite number"),
            reason => format!("not a JSON object: {reason} (column {})", error.column()),
        };
        Flaw {
            line: Some(line),
            field,
            reason,
        }
    })?;
    Ok(Field::root(line, on_line(value.0, line)))
}

/// Words that other programs write for numbers JSON does not have.
const NOT_FINITE: [&str; 8] = [
    "NaN",
    "nan",
    "Infinity",
    "-Infinity",
    "inf",
    "-inf",
    "Inf",
    "-Inf",
];

/// The word or number around column `column` (from 1) of `text`.
fn word_at(text: &str, column: usize) -> &str {
    let part_of_word = |c: &u8| c.is_ascii_alphanumeric() || b"+-._".contains(c);
    let bytes = text.as_bytes();
    let at = column.saturating_sub(1).min(bytes.len());
    let before = bytes[..at]
        .iter()
        .rev()
        .take_while(|c| part_of_word(c))
        .count();
    let after = bytes[at..].iter().take_while(|c| part_of_word(c)).count();
    text.get(at - before..at + after).unwrap_or_default()
}

/// The last key of `text` before column `column` (from 1).
fn key_before(text: &str, column: usize) -> Option<&str> {
    let end = column.min(text.len());
    let read = text
        .get(..end)
        .or_else(|| text.get(..end.checked_sub(1)?))?;
    let (before, _) = read.rsplit_once("\":")?;
    before.rsplit_once('"').map(|(_, key)| key)
}

/// Sets every line in `value` to `line`: a JSON text of this program stands on one line.
fn on_line(value: Value, line: usize) -> Value {
    match value {
        Value::List(items) => Value::List(
            items
                .into_iter()
                .map(|(_, item)| (line, on_line(item, line)))
                .collect(),
        ),
        Value::Table(entries) => Value::Table(
            entries
                .into_iter()
                .map(|(key, _, item)| (key, line, on_line(item, line)))
                .collect(),
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
