//! Readers of machine files and target lines.
//!
//! Nothing past this module validates again: a [`crate::model::Machine`] or
//! [`crate::model::Target`] that a reader returns is complete, finite and consistent. Every
//! refusal names the file, the line, the field and the reason. Positions in a list are counted
//! from 0, so `joint[2]` is the third joint of the file.

mod dh;
mod fields;
mod forest;
mod machine;
mod pose;
mod targets;
mod tree;

pub use machine::{
    MAX_ANGLE, MAX_JOINTS, MAX_LENGTH, MAX_MACHINE_BYTES, MAX_RATIO, MAX_TIPS, machine,
};
pub use targets::{Line, Lines, MAX_CONES, MAX_LINE_BYTES, target};

use std::fmt;

/// Why a machine file or a target line was not accepted.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Defect {
    /// File as the user named it.
    pub file: String,
    /// Line, counted from 1; `None` when the defect concerns the file as a whole.
    pub line: Option<usize>,
    /// Path of the field, `joint[2].limits_deg`; empty when the text has no structure to point at.
    pub field: String,
    /// What is wrong, without a full stop.
    pub reason: String,
}

impl std::error::Error for Defect {}

impl fmt::Display for Defect {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}", self.file)?;
        if let Some(line) = self.line {
            write!(f, ":{line}")?;
        }
        if !self.field.is_empty() {
            write!(f, ": {}", printable(&self.field))?;
        }
        write!(f, ": {}", printable(&self.reason))
    }
}

/// `text` with control characters escaped, so that input cannot steer the reader's terminal.
pub fn printable(text: &str) -> String {
    text.chars()
        .flat_map(|c| {
            let escaped = c.is_control().then(|| c.escape_default());
            let plain = escaped.is_none().then_some(c);
            escaped.into_iter().flatten().chain(plain)
        })
        .collect()
}

/// A defect before the file's name is added.
#[derive(Clone, Debug)]
struct Flaw {
    line: Option<usize>,
    field: String,
    reason: String,
}

impl Flaw {
    fn of_file(reason: impl Into<String>) -> Flaw {
        Flaw {
            line: None,
            field: String::new(),
            reason: reason.into(),
        }
    }

    fn in_file(self, file: &str) -> Defect {
        Defect {
            file: file.to_owned(),
            line: self.line,
            field: self.field,
            reason: self.reason,
        }
    }
}
