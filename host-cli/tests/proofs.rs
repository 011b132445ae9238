//! `balk decide --proofs` and `balk check` from outside.

mod common;

use common::Folder;
use serde_json::Value;

const ORCHARD: &str = include_str!("../demo/orchard.toml");
const CAMERA: &str = include_str!("../demo/camera.jsonl");

/// A folder with the machine, the camera's first targets and the proofs of the unreachable ones.
fn folder(name: &str, text: bool) -> (Folder, Vec<Value>) {
    let targets: Vec<&str> = CAMERA.lines().take(16).collect();
    let folder = Folder::new(name)
        .with("m.toml", ORCHARD)
        .with("t.jsonl", targets.join("\n"));
    let mut arguments = vec![
        "decide", "m.toml", "t.jsonl", "--json", "--proofs", "proofs",
    ];
    if text {
        arguments.push("--text");
    }
    let run = folder.run(&arguments);
    assert_eq!((run.status, run.err.as_str()), (1, ""));
    let rows = run
        .out
        .lines()
        .map(|line| serde_json::from_str(line).unwrap());
    (folder, rows.collect())
}

fn files(rows: &[Value]) -> Vec<&str> {
    rows.iter()
        .filter_map(|row| row["proof_file"].as_str())
        .collect()
}

fn check<'a>(files: &[&'a str], more: &[&'a str]) -> Vec<&'a str> {
    let mut arguments = vec!["check"];
    arguments.extend(files);
    arguments.extend(["--machine", "m.toml", "--targets", "t.jsonl"]);
    arguments.extend(more);
    arguments
}

#[test]
fn every_unreachable_target_has_a_valid_proof_in_both_forms() {
    for (name, text) in [("proofs_bytes", false), ("proofs_text", true)] {
        let (folder, rows) = folder(name, text);
        let unreachable = rows
            .iter()
            .filter(|row| row["verdict"] == "unreachable")
            .count();
        let files = files(&rows);
        assert!(unreachable > 3);
        assert_eq!(files.len(), unreachable);
        let run = folder.run(&check(&files, &["--json"]));
        assert_eq!((run.status, run.err.as_str()), (0, ""));
        for (line, file) in run.out.lines().zip(&files) {
            let row: Value = serde_json::from_str(line).unwrap();
            assert_eq!(row["verdict"], "valid");
            assert_eq!(row["schema"], 1);
            assert_eq!(row["file"], *file);
            assert!(row["steps"].as_u64().unwrap() > 0);
        }
    }
}

#[test]
fn a_proof_is_of_one_machine_and_one_target() {
    let (folder, rows) = folder("proofs_binding", false);
    let files = files(&rows);
    let id = rows
        .iter()
        .find(|row| row["proof_file"] == files[0])
        .unwrap()["id"]
        .clone();
    let wider = CAMERA.replacen("\"xyz_within\":0.00", "\"xyz_within\":0.01", 16);
    let others: Vec<&str> = CAMERA
        .lines()
        .filter(|l| !l.contains(id.as_str().unwrap()))
        .collect();
    let folder = folder
        .with("longer.toml", ORCHARD.replacen("0.62", "0.63", 1))
        .with(
            "looser.toml",
            ORCHARD.replacen("xyz = 0.0001", "xyz = 0.0002", 1),
        )
        .with("wider.jsonl", &wider)
        .with("others.jsonl", others.join("\n"));
    assert_ne!(wider, CAMERA);
    let run = |machine: &'static str, targets: &'static str| {
        folder.run(&[
            "check",
            files[0],
            "--machine",
            machine,
            "--targets",
            targets,
            "--quiet",
        ])
    };
    for (machine, targets, reason) in [
        ("longer.toml", "t.jsonl", "the proof is of another machine"),
        ("looser.toml", "t.jsonl", "the proof is of another machine"),
        ("m.toml", "wider.jsonl", "the proof is of another target"),
        ("m.toml", "others.jsonl", "which others.jsonl does not name"),
    ] {
        let run = run(machine, targets);
        assert_eq!(run.status, 1, "{machine} {targets}");
        assert!(run.out.starts_with("invalid  "), "{}", run.out);
        assert!(run.out.contains(reason), "{}", run.out);
    }
}

#[test]
fn what_is_no_proof_is_an_error() {
    let (folder, rows) = folder("proofs_damaged", true);
    let file = files(&rows)[0];
    let folder = folder
        .with("no.proof", "balk?")
        .with("cut.txt", "balk-proof 1\nmachine 00\n");
    let run = folder.run(&check(
        &[file, "no.proof", "cut.txt", "absent"],
        &["--quiet"],
    ));
    assert_eq!(run.status, 4);
    let words: Vec<&str> = run
        .out
        .lines()
        .map(|l| l.split(' ').next().unwrap())
        .collect();
    assert_eq!(words, ["valid", "error", "error", "error"]);
}

#[test]
fn the_first_bad_step_is_named() {
    let (folder, rows) = folder("proofs_bad_step", true);
    let path = std::path::Path::new(env!("CARGO_TARGET_TMPDIR")).join("proofs_bad_step");
    let text = std::fs::read_to_string(path.join(files(&rows)[0])).unwrap();
    let first = text.lines().find(|line| line.starts_with("step ")).unwrap();
    let quantity = first.split(' ').nth(1).unwrap();
    let rule = first.split(" by ").nth(1).unwrap();
    let forged = text.replacen(first, &format!("step {quantity} none by {rule}"), 1);
    let folder = folder.with("forged.txt", forged);
    let run = folder.run(&check(&["forged.txt"], &["--quiet"]));
    assert_eq!(run.status, 1);
    assert!(run.out.contains("item 0, `step "), "{}", run.out);
    assert!(run.out.contains("only this follows"), "{}", run.out);
}

#[test]
fn a_folder_that_cannot_be_made_is_a_fault() {
    let folder = Folder::new("proofs_no_folder")
        .with("m.toml", ORCHARD)
        .with("t.jsonl", CAMERA.lines().next().unwrap())
        .with("taken", "");
    let run = folder.run(&["decide", "m.toml", "t.jsonl", "--proofs", "taken/below"]);
    assert_eq!(run.status, 5);
    assert!(run.err.starts_with("taken/below: "), "{}", run.err);
}
