//! Fields to be taken from a file one by one, each knowing its line and path.

use nalgebra::Vector3;

use super::Flaw;
use super::tree::Value;

/// A value with the place it was read from.
#[derive(Debug)]
pub(super) struct Field {
    line: usize,
    path: String,
    value: Value,
}

impl Field {
    /// The root of a file that begins on line `line`.
    pub fn root(line: usize, value: Value) -> Field {
        let path = String::new();
        Field { line, path, value }
    }

    /// The complaint `reason` about this field.
    pub fn flaw(&self, reason: impl Into<String>) -> Flaw {
        Flaw {
            line: Some(self.line),
            field: self.path.clone(),
            reason: reason.into(),
        }
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
        let Value::List(items) = self.value else {
            return Err(self.expected("a list"));
        };
        let path = &self.path;
        Ok(items
            .into_iter()
            .enumerate()
            .map(|(k, (line, value))| Field {
                line,
                path: format!("{path}[{k}]"),
                value,
            })
            .collect())
    }

    /// The items of a list of at least one and at most `max`; `what` names them in complaints.
    pub fn bounded(self, max: usize, what: &str) -> Result<Vec<Field>, Flaw> {
        let place = self.flaw("");
        let items = self.list()?;
        match items.len() {
            0 => Err(Flaw {
                reason: format!("has no {what}"),
                ..place
            }),
            n if n > max => Err(Flaw {
                reason: format!("has {n} {what}, more than {max}"),
                ..place
            }),
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
        let Value::Table(entries) = &self.value else {
            return None;
        };
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
        let Value::Table(entries) = self.value else {
            return Err(self.expected("a table"));
        };
        let fields = Fields {
            line: self.line,
            path: self.path,
            entries,
        };
        let stranger = fields
            .entries
            .iter()
            .find(|(key, ..)| !known.contains(&key.as_str()));
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
        choices
            .iter()
            .find(|(word, _)| *word == text)
            .map(|(_, value)| *value)
            .ok_or_else(|| {
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
        Flaw {
            line: Some(self.line),
            field: self.path_of(key),
            reason: reason.into(),
        }
    }

    fn path_of(&self, key: &str) -> String {
        if self.path.is_empty() {
            key.to_owned()
        } else {
            format!("{}.{key}", self.path)
        }
    }

    /// Takes the field `key` if it is there.
    pub fn take(&mut self, key: &str) -> Option<Field> {
        let at = self.entries.iter().position(|(name, ..)| name == key)?;
        let (_, line, value) = self.entries.swap_remove(at);
        Some(Field {
            line,
            path: self.path_of(key),
            value,
        })
    }

    /// Takes the field `key`, which must be there.
    pub fn need(&mut self, key: &str) -> Result<Field, Flaw> {
        self.take(key).ok_or_else(|| self.flaw(key, "missing"))
    }

    /// Takes the one field of `keys` that is there, with its place in `keys`.
    pub fn one_of(&mut self, keys: &[&str]) -> Result<Option<(usize, Field)>, Flaw> {
        let mut found: Option<(usize, Field)> = None;
        for (place, key) in keys.iter().enumerate() {
            let Some(field) = self.take(key) else {
                continue;
            };
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
