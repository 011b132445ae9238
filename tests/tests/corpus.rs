//! Every file of `corpus/` is accepted, rejected or not read, for the reason its first line tells.

use balk::log::replay;
use balk::search::Solver;
use balk_checker::{Checker, binary, text};
use balk_core::record::{Frame, read};
use std::collections::{BTreeMap, BTreeSet};
use std::fs;
use std::path::{Path, PathBuf};

const CLASSES: [&str; 3] = ["accepted", "rejected", "malformed"];

fn root() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("corpus")
}

/// One file: its name, what it says on its comment lines, and all of it.
struct File {
    name: String,
    /// What stands on the first line.
    said: String,
    /// What stands behind `# machine: ` and `# target: `.
    notes: BTreeMap<String, String>,
    text: String,
}

impl File {
    fn read(path: &Path) -> File {
        let text = fs::read_to_string(path).unwrap();
        let mut comments = text.lines().map_while(|line| line.strip_prefix("# "));
        let said = comments.next().expect("a file says what it is").to_owned();
        let notes = comments.filter_map(|line| line.split_once(": "));
        File {
            name: path.file_name().unwrap().to_str().unwrap().to_owned(),
            said,
            notes: notes
                .map(|(key, value)| (key.to_owned(), value.to_owned()))
                .collect(),
            text,
        }
    }

    /// The bytes that the lines of hexadecimal digits stand for.
    fn bytes(&self) -> Vec<u8> {
        let lines = self.text.lines().filter(|line| !line.starts_with('#'));
        let digits: String = lines.collect();
        let byte = |at: usize| u8::from_str_radix(&digits[at..at + 2], 16).unwrap();
        (0..digits.len()).step_by(2).map(byte).collect()
    }

    fn beside(&self, ending: &str) -> String {
        fs::read_to_string(root().join(format!("{}.{ending}", self.notes["machine"]))).unwrap()
    }

    /// The line of the target that a proof is given for.
    fn target(&self) -> String {
        let name = format!("{{\"id\":\"{}\",", self.notes["target"]);
        let lines = self.beside("jsonl");
        let line = lines.lines().find(|line| line.starts_with(&name));
        line.expect("the target is there").to_owned()
    }
}

/// What is said of a proof.
fn proof(file: &File) -> String {
    let proof = if file.name.ends_with(".proof") {
        text::read(&file.text).map_err(|error| error.to_string())
    } else {
        binary::read(&file.bytes()).map_err(|error| error.to_string())
    };
    let checker = Checker::new(&file.beside("toml"), "cup").unwrap();
    match proof.map(|proof| checker.check(&proof, &file.target())) {
        Err(error) => format!("malformed: {error}"),
        Ok(Err(rejection)) => format!("rejected: {rejection}"),
        Ok(Ok(_)) => "accepted".to_owned(),
    }
}

/// What is said of a record or seal.
fn record(file: &File) -> String {
    let machine = balk::read::machine(file.beside("toml").as_bytes(), "arm.toml").unwrap();
    let solver = Solver::new(&machine, 0).unwrap();
    match read(&file.bytes()) {
        Err(error) => format!("malformed: {error}"),
        Ok(Frame::Seal(_)) => "accepted".to_owned(),
        Ok(Frame::Record(record)) => match replay(&solver, &record) {
            Err(mismatch) => format!("rejected: {mismatch}"),
            Ok(()) => "accepted".to_owned(),
        },
    }
}

/// Judges every file of one kind; there must be at least so many of each class, all different.
fn judge(kind: &str, say: impl Fn(&File) -> String, least: [usize; 3]) {
    let mut different = BTreeSet::new();
    let mut run = 0;
    for (class, least) in CLASSES.into_iter().zip(least) {
        let folder = fs::read_dir(root().join(kind).join(class)).unwrap();
        let mut count = 0;
        for entry in folder {
            let file = File::read(&entry.unwrap().path());
            let said = say(&file);
            assert_eq!(said, file.said, "{kind}/{class}/{}", file.name);
            assert!(
                said.starts_with(class),
                "{kind}/{class}/{}: {said}",
                file.name
            );
            // The same text may be one file in hexadecimal and one that is not.
            let (_, content) = file.text.split_once('\n').expect("a second line");
            let new = different.insert((file.name.ends_with(".hex"), content.to_owned()));
            assert!(new, "{kind}/{class}/{} is another's copy", file.name);
            count += 1;
        }
        println!("{kind}, {class}: {count}");
        assert!(count >= least, "{kind}, {class}: only {count}");
        run += count;
    }
    // Nothing lies where it is not judged.
    assert_eq!(files(&root().join(kind)), run, "{kind}");
}

fn files(folder: &Path) -> usize {
    let entries = fs::read_dir(folder)
        .unwrap()
        .map(|entry| entry.unwrap().path());
    entries
        .map(|path| if path.is_dir() { files(&path) } else { 1 })
        .sum()
}

#[test]
fn proofs_are_judged_as_they_say() {
    judge("proofs", proof, [40, 75, 75]);
}

#[test]
fn records_are_judged_as_they_say() {
    judge("records", record, [15, 20, 40]);
}

#[test]
fn reasons_of_all_kinds_occur() {
    let mut said = BTreeSet::new();
    for kind in ["proofs", "records"] {
        for class in &CLASSES[1..] {
            for entry in fs::read_dir(root().join(kind).join(class)).unwrap() {
                said.insert(File::read(&entry.unwrap().path()).said);
            }
        }
    }
    for reason in [
        "rejected: the proof is of another machine",
        "rejected: the proof is of another tip",
        "rejected: the proof is of another target",
        "rejected: the target is not read",
        "rejected: wrong number of frames or root spans",
        "rejected: frame 1 is off the joint's axis",
        "rejected: the root does not cover variable 1",
        "rejected: 1 branches have no end",
        "there is no such relation or quantity here",
        "the rule says nothing of the quantity",
        "the quantity stands in more than one product",
        "a factor may be zero",
        "only this follows",
        "the claim leaves nothing and should say none",
        "the split is outside of what is known",
        "too deep",
        "every branch has ended before",
        "malformed: ends too early",
        "malformed: something follows the end",
        "malformed: not a proof of a known version",
        "malformed: damaged: the digest does not fit",
        "malformed: a number is not well written or out of range",
        "malformed: a text is not well written",
        "malformed: an unknown word or code",
        "an interval is reversed",
        "a step needs a quantity",
        "rejected: another machine: the fingerprints differ",
        "rejected: verdict differs: the target passes here",
        "rejected: bytes differ",
        "malformed: the checksum differs",
        "malformed: too short",
        "malformed: the tree does not close every part once",
        "malformed: unknown kind",
        "malformed: unknown version",
        "malformed: unknown orientation",
        "malformed: unknown rules",
        "malformed: the position is out of range",
        "malformed: a half sine is out of range",
        "malformed: an axis is not of unit length",
        "cones are more than fit",
        "steps are more than fit",
    ] {
        assert!(
            said.iter().any(|said| said.contains(reason)),
            "never said: {reason}"
        );
    }
}
