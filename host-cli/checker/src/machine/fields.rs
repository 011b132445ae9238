//! Fields of a TOML table, taken one by one, numbers as their text writes them.

use dashu_ratio::RBig;
use toml_edit::{Item, TableLike, Value};

use super::Amount;
use crate::exact::decimal;

/// Why a machine file is not read.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum ReadError {
    /// No TOML.
    #[error("not TOML: {0}")]
    Syntax(String),
    /// A field is wrong.
    #[error("{field}: {reason}")]
    Field {
        /// Its path; list places count from 0.
        field: String,
        /// What is wrong.
        reason: &'static str,
    },
    /// No tip of that name.
    #[error("no tip is named {0:?}")]
    Tip(String),
}

/// A table with its path.
pub struct Fields<'a> {
    path: String,
    table: &'a dyn TableLike,
}

/// A value with its path.
pub struct Field<'a> {
    path: String,
    item: &'a Item,
}

/// An item of an inner list with its path.
pub struct Element<'a> {
    path: String,
    value: &'a Value,
}

fn flaw<T>(field: &str, reason: &'static str) -> Result<T, ReadError> {
    Err(ReadError::Field {
        field: field.to_owned(),
        reason,
    })
}

impl<'a> Fields<'a> {
    /// `table`, all of whose keys must be `known`.
    pub fn new(path: &str, table: &'a dyn TableLike, known: &[&str]) -> Result<Self, ReadError> {
        for (key, _) in table.iter() {
            if !known.contains(&key) {
                return flaw(&join(path, key), "unknown field");
            }
        }
        Ok(Self {
            path: path.to_owned(),
            table,
        })
    }

    /// The complaint `reason` about `key`.
    pub fn flaw<T>(&self, key: &str, reason: &'static str) -> Result<T, ReadError> {
        flaw(&join(&self.path, key), reason)
    }

    /// The field `key`, if it is there.
    pub fn take(&self, key: &str) -> Option<Field<'a>> {
        Some(Field {
            path: join(&self.path, key),
            item: self.table.get(key)?,
        })
    }

    /// The field `key`.
    pub fn need(&self, key: &str) -> Result<Field<'a>, ReadError> {
        match self.take(key) {
            Some(field) => Ok(field),
            None => self.flaw(key, "missing"),
        }
    }

    /// The one field of `key` and `key_deg` that is there, true for the second.
    pub fn either(&self, key: &str) -> Result<Option<(Field<'a>, bool)>, ReadError> {
        let degrees = format!("{key}_deg");
        match (self.take(key), self.take(&degrees)) {
            (Some(_), Some(_)) => self.flaw(&degrees, "given in both units"),
            (Some(field), None) => Ok(Some((field, false))),
            (None, field) => Ok(field.map(|field| (field, true))),
        }
    }

    /// Three numbers, zero if left out.
    pub fn vector(&self, key: &str) -> Result<Option<[RBig; 3]>, ReadError> {
        self.take(key).map(|field| field.numbers()).transpose()
    }

    /// The number `key`, zero if left out.
    pub fn number(&self, key: &str) -> Result<RBig, ReadError> {
        self.take(key)
            .map_or(Ok(RBig::ZERO), |field| field.number())
    }
}

impl<'a> Field<'a> {
    /// The complaint `reason` about it.
    pub fn flaw<T>(&self, reason: &'static str) -> Result<T, ReadError> {
        flaw(&self.path, reason)
    }

    /// A text.
    pub fn text(&self) -> Result<&'a str, ReadError> {
        self.item
            .as_str()
            .map_or_else(|| self.flaw("must be a text"), Ok)
    }

    /// A text with at least one character.
    pub fn name(&self) -> Result<String, ReadError> {
        match self.text()? {
            "" => self.flaw("must not be empty"),
            text => Ok(text.to_owned()),
        }
    }

    /// A number.
    pub fn number(&self) -> Result<RBig, ReadError> {
        match self.item.as_value().and_then(number) {
            Some(number) => Ok(number),
            None => self.flaw("must be a decimal number"),
        }
    }

    /// A list of `N` numbers.
    pub fn numbers<const N: usize>(&self) -> Result<[RBig; N], ReadError> {
        let list = self.item.as_array();
        let numbers = list.and_then(|list| list.iter().map(number).collect::<Option<Vec<_>>>());
        match numbers.and_then(|numbers| numbers.try_into().ok()) {
            Some(numbers) => Ok(numbers),
            None => self.flaw("must be a list of decimal numbers of the right length"),
        }
    }

    /// A table with `known` keys.
    pub fn table(&self, known: &[&str]) -> Result<Fields<'a>, ReadError> {
        match self.item.as_table_like() {
            Some(table) => Fields::new(&self.path, table, known),
            None => self.flaw("must be a table"),
        }
    }

    /// A list of tables, written as `[[...]]` or inside brackets.
    pub fn tables(&self, known: &[&str]) -> Result<Vec<Fields<'a>>, ReadError> {
        let path = |place: usize| format!("{}[{place}]", self.path);
        if let Some(tables) = self.item.as_array_of_tables() {
            return tables
                .iter()
                .enumerate()
                .map(|(place, table)| Fields::new(&path(place), table, known))
                .collect();
        }
        let Some(list) = self.item.as_array() else {
            return self.flaw("must be a list of tables");
        };
        let elements = list.iter().enumerate().map(|(place, value)| Element {
            path: path(place),
            value,
        });
        elements.map(|element| element.table(known)).collect()
    }
}

impl<'a> Element<'a> {
    fn table(&self, known: &[&str]) -> Result<Fields<'a>, ReadError> {
        match self.value.as_inline_table() {
            Some(table) => Fields::new(&self.path, table, known),
            None => flaw(&self.path, "must be a table"),
        }
    }
}

/// `number`, of degrees or not.
pub fn amount(number: RBig, degrees: bool) -> Amount {
    if degrees {
        Amount::degrees(number)
    } else {
        Amount::plain(number)
    }
}

fn join(path: &str, key: &str) -> String {
    if path.is_empty() {
        key.to_owned()
    } else {
        format!("{path}.{key}")
    }
}

/// The decimal that a TOML number is written as.
fn number(value: &Value) -> Option<RBig> {
    let written = match value {
        Value::Integer(number) => number.as_repr(),
        Value::Float(number) => number.as_repr(),
        _ => None,
    };
    decimal::parse(&written?.as_raw().as_str()?.replace('_', ""))
}
