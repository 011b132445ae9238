//! `balk audit` from outside: every form of a log, every defect of one.

mod common;

use balk_core::record::{Chain, Frame, Log, Record, Seal, read};
use common::{Folder, Run};
use serde_json::Value;

const ORCHARD: &str = include_str!("../demo/orchard.toml");
const CAMERA: &str = include_str!("../demo/camera.jsonl");
/// Another machine.
const ONE_JOINT: &str =
    "[[joint]]\nname = \"a\"\nkind = \"revolute\"\n[[tip]]\nname = \"end\"\nxyz = [1, 0, 0]\n";

/// A folder with the machine and what `screen --json` says of the camera's first targets.
fn folder(name: &str) -> (Folder, String) {
    let targets: Vec<&str> = CAMERA.lines().take(24).collect();
    let folder = Folder::new(name)
        .with("m.toml", ORCHARD)
        .with("other.toml", ONE_JOINT)
        .with("t.jsonl", targets.join("\n"));
    let run = folder.run(&["screen", "m.toml", "t.jsonl", "--json", "--splits", "4"]);
    (folder, run.out)
}

/// The bytes of the records and of the seal in a log of JSON lines.
fn items(log: &str) -> Vec<Vec<u8>> {
    let hex = |line: &str| {
        let row: Value = serde_json::from_str(line).unwrap();
        let hex = row["record"].as_str().or(row["seal"].as_str())?.to_owned();
        let byte = |at: usize| u8::from_str_radix(&hex[at..at + 2], 16).unwrap();
        Some((0..hex.len()).step_by(2).map(byte).collect())
    };
    log.lines().filter_map(hex).collect()
}

fn lines(items: &[Vec<u8>]) -> String {
    let hex =
        |item: &Vec<u8>| -> String { item.iter().map(|byte| format!("{byte:02x}")).collect() };
    items
        .iter()
        .map(|item| format!("INFO refusal {}\n", hex(item)))
        .collect()
}

fn record(bytes: &[u8]) -> Record {
    match read(bytes) {
        Ok(Frame::Record(record)) => record,
        other => panic!("{other:?}"),
    }
}

/// What a controller with these records sends.
fn sent(items: &[Vec<u8>]) -> Vec<u8> {
    let mut log = Box::new(Log::<65_536>::new());
    for item in &items[..items.len() - 1] {
        log.push(record(item).bytes());
    }
    log.seal().unwrap();
    let mut bytes = vec![0; 65_536];
    let count = log.read(&mut bytes);
    bytes.truncate(count);
    bytes
}

/// Status and the word of each row but `proved`.
fn audit(folder: Folder, log: impl AsRef<[u8]>) -> (i32, Vec<String>) {
    let folder = folder.with("log", log);
    let run = folder.run(&["audit", "log", "--machine", "m.toml", "--json", "--quiet"]);
    assert_eq!(run.err, "");
    (
        run.status,
        words(&run)
            .into_iter()
            .filter(|word| word != "proved")
            .collect(),
    )
}

fn rows(run: &Run) -> Vec<Value> {
    run.out
        .lines()
        .map(|row| serde_json::from_str(row).unwrap())
        .collect()
}

fn words(run: &Run) -> Vec<String> {
    let word = |row: &Value| row["verdict"].as_str().map(str::to_owned);
    rows(run).iter().filter_map(word).collect()
}

#[test]
fn every_form_of_a_log_is_proved_again() {
    let (folder, log) = folder("audit_forms");
    let items = items(&log);
    assert!((8..24).contains(&items.len()), "{}", items.len());
    let folder = folder
        .with("json", &log)
        .with("hex", lines(&items))
        .with(
            "mixed",
            lines(&items).replace("INFO", "INFO arm at rest\nINFO"),
        )
        .with("frames", sent(&items));
    for form in ["json", "hex", "mixed", "frames"] {
        let run = folder.run(&["audit", form, "--machine", "m.toml", "--json"]);
        assert_eq!((run.status, run.err.as_str()), (0, ""), "{form}");
        let mut rows = rows(&run);
        let summary = rows.pop().unwrap();
        assert_eq!(rows.len(), items.len() - 1);
        for (number, row) in rows.iter().enumerate() {
            assert_eq!(row["schema"], 1);
            assert_eq!(
                (&row["verdict"], &row["tip"]),
                (&"proved".into(), &"gripper".into())
            );
            assert_eq!(row["number"], number);
            let place = if form == "frames" { "byte" } else { "line" };
            assert!(row[place].is_u64(), "{row}");
        }
        assert_eq!(summary["summary"]["proved"], rows.len());
        assert_eq!(summary["summary"]["lost"], 0);
    }
}

#[test]
fn a_log_may_come_from_standard_input_and_any_number_of_threads() {
    let (folder, log) = folder("audit_stdin");
    let folder = folder.with("log", &log);
    let from_file = folder.run(&["audit", "log", "--machine", "m.toml", "--json"]);
    for threads in ["1", "2", "7"] {
        let arguments = [
            "audit",
            "-",
            "--machine",
            "m.toml",
            "--json",
            "--threads",
            threads,
        ];
        assert_eq!(folder.run_with(&arguments, &log), from_file);
    }
}

#[test]
fn people_get_rows_a_summary_and_the_caution() {
    let (folder, log) = folder("audit_people");
    let mut items = items(&log);
    items.remove(2);
    let folder = folder.with("log", lines(&items));
    let run = folder.run(&["audit", "log", "--machine", "m.toml"]);
    for part in [
        "answer        place         details\n",
        "proved        line 1        number 0: tip gripper\n",
        "missing       line 3        1 record after number 1\n",
        " proved, 1 missing\n",
        "not a safety function",
    ] {
        assert!(run.out.contains(part), "{part}: {}", run.out);
    }
    assert_eq!((run.status, run.err.as_str()), (1, ""));
}

#[test]
fn defects_are_named() {
    let (_, log) = folder("audit_defects");
    let items = items(&log);
    let last = items.len() - 1;
    // The number 3 with other options, and everything else about it right.
    let mut other = record(&items[3]);
    other.options.pivots += 1;
    // A record of a target that passes: all of space.
    let mut passes = record(&items[3]);
    passes.target.position = [balk_core::fixed::Interval::UNIT; 3];
    // A tree that is not the one the search finds.
    let mut tree = record(&items[3]);
    let rows = balk_core::screen::Step::Rows;
    let bounds = balk_core::screen::Step::Bounds;
    let at = tree.steps.iter().position(|step| *step == bounds).unwrap();
    tree.steps[at] = rows;
    let mut machine = record(&items[3]);
    machine.fingerprint ^= 1;
    let with = |record: &Record| {
        let mut items = items.clone();
        items[3] = record.bytes().to_vec();
        items
    };
    let changed = |change: &dyn Fn(&mut Vec<Vec<u8>>)| {
        let mut items = items.clone();
        change(&mut items);
        items
    };
    let broken = "chain broken";
    /// A name, a log, the status and the words expected.
    type Case<'a> = (&'a str, Vec<Vec<u8>>, i32, &'a [&'a str]);
    let cases: [Case; 13] = [
        ("nothing", items.clone(), 0, &[]),
        (
            "flipped",
            changed(&|items| items[3][40] ^= 4),
            1,
            &["damaged", "missing"],
        ),
        (
            "deleted",
            changed(&|items| drop(items.remove(3))),
            1,
            &["missing"],
        ),
        (
            "first deleted",
            changed(&|items| drop(items.remove(0))),
            1,
            &["missing"],
        ),
        (
            "last deleted",
            changed(&|items| drop(items.remove(last - 1))),
            1,
            &["missing"],
        ),
        (
            "unsealed",
            changed(&|items| drop(items.pop())),
            3,
            &["not sealed"],
        ),
        (
            "repeated",
            changed(&|items| items.insert(4, items[2].clone())),
            1,
            &["repeated"],
        ),
        (
            "swapped",
            changed(&|items| items.swap(3, 4)),
            1,
            &["missing", "out of order"],
        ),
        (
            "sealed too soon",
            changed(&|items| items.swap(last - 1, last)),
            1,
            &["missing", "out of order", "not sealed"],
        ),
        ("exchanged", with(&other), 1, &[broken]),
        ("passes", with(&passes), 1, &[broken, "not proved"]),
        ("other tree", with(&tree), 1, &[broken, "not proved"]),
        ("other machine", with(&machine), 1, &[broken, "not proved"]),
    ];
    for (name, items, status, expected) in cases {
        let (folder, _) = folder(&format!("audit_{}", name.replace(' ', "_")));
        assert_eq!(
            audit(folder, lines(&items)),
            (
                status,
                expected.iter().map(|word| (*word).to_owned()).collect()
            ),
            "{name}"
        );
    }
}

#[test]
fn reasons_say_why_a_record_is_not_proved() {
    let (folder, log) = folder("audit_reasons");
    let items = items(&log);
    let folder = folder.with("log", lines(&items));
    let run = folder.run(&[
        "audit",
        "log",
        "--machine",
        "other.toml",
        "--json",
        "--quiet",
    ]);
    assert_eq!(run.status, 1);
    for row in rows(&run) {
        assert_eq!(row["verdict"], "not proved");
        let reason = row["reason"].as_str().unwrap();
        assert!(reason.starts_with("another machine: "), "{reason}");
    }
    let mut chain = Chain::new();
    let mut passes = record(&items[0]);
    passes.target.position = [balk_core::fixed::Interval::UNIT; 3];
    let mut passes = passes.bytes();
    chain.add(&mut passes);
    let mut tree = record(&items[1]);
    tree.steps[0] = balk_core::screen::Step::Rows;
    tree.steps.truncate(1);
    let mut tree = tree.bytes();
    chain.add(&mut tree);
    let seal = chain.seal(3).bytes().to_vec();
    let folder = folder.with("log", lines(&[passes.to_vec(), tree.to_vec(), seal]));
    let run = folder.run(&["audit", "log", "--machine", "m.toml"]);
    assert!(
        run.out
            .contains("number 0: tip gripper: verdict differs: the target passes here ("),
        "{}",
        run.out
    );
    assert!(
        run.out
            .contains("number 1: tip gripper: bytes differ, from byte "),
        "{}",
        run.out
    );
    assert!(
        run.out.contains("counted 3 of its records as lost"),
        "{}",
        run.out
    );
}

#[test]
fn runs_may_follow_each_other() {
    let (_, log) = folder("audit_runs");
    let run = items(&log);
    let (folder_twice, _) = folder("audit_runs_twice");
    assert_eq!(
        audit(folder_twice, [sent(&run), sent(&run)].concat()),
        (0, vec![])
    );
    // The first run was not sealed.
    let mut unsealed = run.clone();
    unsealed.pop();
    let (folder_unsealed, _) = folder("audit_runs_unsealed");
    let log = lines(&[unsealed, run].concat());
    assert_eq!(
        audit(folder_unsealed, log),
        (3, vec!["not sealed".to_owned()])
    );
}

#[test]
fn damaged_lines_are_named_and_the_others_proved() {
    let (_, log) = folder("audit_lines");
    let rows: Vec<&str> = log.lines().collect();
    let refused = rows.iter().position(|row| row.contains("refused")).unwrap();
    let row = rows[refused];
    for (name, row) in [
        ("cut", row[..row.len() / 2].to_owned()),
        ("odd", row.replace("\"}", "0\"}")),
        ("letters", row.replace("\"b1", "\"g1")),
        ("recordless", row.replace("record", "recorc")),
        ("schema", row.replace("schema\":1", "schema\":2")),
        ("long", format!("{row}{}", " x".repeat(1 << 16))),
    ] {
        let mut rows = rows.clone();
        rows[refused] = &row;
        let (folder, _) = folder(&format!("audit_lines_{name}"));
        let found = audit(folder, rows.join("\n"));
        assert_eq!(
            found,
            (1, vec!["damaged".to_owned(), "missing".to_owned()]),
            "{name}"
        );
    }
}

#[test]
fn what_is_no_log_cannot_be_read() {
    let (folder, _) = folder("audit_no_log");
    let garbage: Vec<u8> = (0..2000u32).map(|k| (k * k / 7) as u8).collect();
    let folder = folder
        .with("empty", "\n \n")
        .with("garbage", garbage)
        .with("text", "the quick brown fox\n".repeat(9));
    for (file, reason) in [
        ("absent", "No such file or directory (os error 2)"),
        ("empty", "is empty; a log holds at least a seal"),
        ("garbage", "holds no record and no seal that can be read"),
        ("text", "is no log: neither frames between zero bytes, nor "),
        (
            "t.jsonl",
            "is no log: neither frames between zero bytes, nor ",
        ),
    ] {
        let run = folder.run(&["audit", file, "--machine", "m.toml"]);
        assert_eq!(run.status, 4, "{file}");
        assert!(
            run.err.starts_with(&format!("{file}: {reason}")),
            "{}",
            run.err
        );
    }
}

#[test]
fn a_ring_that_overflowed_says_so() {
    let (folder, log) = folder("audit_ring");
    let items = items(&log);
    let mut ring = Log::<300>::new();
    for item in &items[..items.len() - 1] {
        ring.push(record(item).bytes());
    }
    ring.seal().unwrap();
    let mut bytes = [0; 300];
    let count = ring.read(&mut bytes);
    let folder = folder.with("log", &bytes[..count]);
    let run = folder.run(&["audit", "log", "--machine", "m.toml", "--json"]);
    assert_eq!(run.status, 1);
    let rows = rows(&run);
    let summary = &rows[rows.len() - 1]["summary"];
    assert_eq!(rows[0]["verdict"], "missing");
    assert_eq!(
        (&summary["missing"], &summary["lost"]),
        (&ring.lost().into(), &ring.lost().into())
    );
    assert!(ring.lost() > 0);
}

#[test]
fn a_log_with_no_refusal_is_its_seal() {
    let (folder, _) = folder("audit_no_refusal");
    let seal: Seal = Chain::new().seal(0);
    assert_eq!(audit(folder, lines(&[seal.bytes().to_vec()])), (0, vec![]));
}
