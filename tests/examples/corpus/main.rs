//! Writes `tests/corpus`: proofs and records that are accepted, rejected or not read at all, each
//! with a single flaw, which its name and its first line tell. Run it again when a format changes:
//! `cargo run -p balk-tests --example corpus`.

mod proofs;
mod records;

use std::fs;
use std::path::{Path, PathBuf};

/// What is to be said of a file.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Said {
    /// It holds.
    Accepted,
    /// It is read, but does not hold.
    Rejected(String),
    /// It is not read.
    Malformed(String),
}

/// The folder of one kind of evidence.
pub struct Corpus {
    root: PathBuf,
    count: usize,
    /// What is not of the class it was written for.
    pub wrong: Vec<String>,
}

impl Corpus {
    fn new(kind: &str) -> Corpus {
        let root = Path::new(env!("CARGO_MANIFEST_DIR"))
            .join("corpus")
            .join(kind);
        for class in ["accepted", "rejected", "malformed"] {
            let folder = root.join(class);
            if folder.exists() {
                fs::remove_dir_all(&folder).expect("an old folder can be removed");
            }
            fs::create_dir_all(&folder).expect("a folder can be made");
        }
        Corpus {
            root,
            count: 0,
            wrong: Vec::new(),
        }
    }

    /// Writes a file into the folder of what is said of it.
    ///
    /// # Panics
    /// When there is a file of its name.
    pub fn write(&mut self, class: &str, name: &str, said: &Said, rest: &str) {
        let (found, first) = match said {
            Said::Accepted => ("accepted", "# accepted".to_owned()),
            Said::Rejected(reason) => ("rejected", format!("# rejected: {reason}")),
            Said::Malformed(reason) => ("malformed", format!("# malformed: {reason}")),
        };
        if found != class {
            self.wrong.push(format!("{name}, not {class}: {first}"));
        }
        let path = self.root.join(class).join(name);
        assert!(!path.exists(), "{name} is written twice");
        fs::write(path, format!("{first}\n{rest}")).expect("a file can be written");
        self.count += 1;
    }
}

/// Bytes as lines of hexadecimal digits.
pub fn hex(bytes: &[u8]) -> String {
    let line = |part: &[u8]| -> String {
        let digits: String = part.iter().map(|byte| format!("{byte:02x}")).collect();
        digits + "\n"
    };
    bytes.chunks(48).map(line).collect()
}

/// A file beside the folders.
pub fn beside(name: &str) -> String {
    let path = Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("corpus")
        .join(name);
    fs::read_to_string(path).expect("the file is there")
}

/// The targets of a machine's file of targets, by name.
pub fn targets(machine: &str) -> Vec<(String, String)> {
    let line = |line: &str| {
        let fields: serde_json::Value = serde_json::from_str(line).expect("it is JSON");
        let id = fields["id"].as_str().expect("it has a name").to_owned();
        (id, line.to_owned())
    };
    beside(&format!("{machine}.jsonl"))
        .lines()
        .map(line)
        .collect()
}

fn main() {
    let mut of_proofs = Corpus::new("proofs");
    proofs::write(&mut of_proofs);
    let mut of_records = Corpus::new("records");
    records::write(&mut of_records);
    println!("{} proofs, {} records", of_proofs.count, of_records.count);
    let wrong = [of_proofs.wrong, of_records.wrong].concat();
    assert!(wrong.is_empty(), "{wrong:#?}");
}
