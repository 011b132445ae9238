//! The program from outside: statuses, rows, streams.

mod common;

use std::io::{BufRead, BufReader, Write};
use std::process::Stdio;

use balk::kinematics::{ALLOWANCE, meets};
use balk::read::{self, Line};
use common::{Folder, Run, finish};
use serde_json::Value;

const ORCHARD: &str = include_str!("../demo/orchard.toml");
const CAMERA: &str = include_str!("../demo/camera.jsonl");

const NEAR: &str = r#"{"id":"near","xyz":[0.8,0,0.6],"xyz_within":0.01}"#;
const FAR: &str = r#"{"id":"far","xyz":[5,0,0],"xyz_within":0.01}"#;
const WRONG: &str = r#"{"id":"wrong","xyz":[0.8,0,0.6],"xyz_within":-1}"#;

fn orchard(name: &str) -> Folder {
    Folder::new(name).with("m.toml", ORCHARD)
}

fn rows(run: &Run) -> Vec<Value> {
    run.out
        .lines()
        .map(|row| serde_json::from_str(row).unwrap())
        .collect()
}

fn status(name: &str, command: &str, lines: &[&str]) -> i32 {
    orchard(name)
        .run_with(&[command, "m.toml", "-", "--json"], &lines.join("\n"))
        .status
}

#[test]
fn status_0_when_all_is_reachable_or_passed() {
    assert_eq!(status("status_0", "decide", &[NEAR, NEAR]), 0);
    assert_eq!(status("status_0_screen", "screen", &[NEAR]), 0);
    assert_eq!(status("status_0_nothing", "decide", &["", "  "]), 0);
}

#[test]
fn status_1_when_any_is_unreachable_or_refused() {
    assert_eq!(status("status_1", "decide", &[NEAR, FAR, NEAR]), 1);
    assert_eq!(status("status_1_screen", "screen", &[NEAR, FAR, NEAR]), 1);
}

#[test]
fn status_2_when_the_command_line_is_wrong() {
    let folder = orchard("status_2").with("t.jsonl", NEAR);
    let wrong: [&[&str]; 11] = [
        &[],
        &["decide"],
        &["decide", "m.toml"],
        &["guess", "m.toml", "t.jsonl"],
        &["decide", "m.toml", "t.jsonl", "--threads", "0"],
        &["decide", "m.toml", "t.jsonl", "--nodes", "many"],
        &["screen", "m.toml", "t.jsonl", "--splits", "0"],
        &["screen", "m.toml", "t.jsonl", "--nodes", "9"],
        &["decide", "-", "-"],
        &["audit", "t.jsonl"],
        &["audit", "-", "--machine", "-"],
    ];
    for arguments in wrong {
        let run = folder.run(arguments);
        assert_eq!((run.status, run.out.as_str()), (2, ""), "{arguments:?}");
        assert!(
            run.err.contains("--help") || run.err.contains("Usage: balk"),
            "{arguments:?}: {}",
            run.err
        );
    }
}

#[test]
fn status_3_when_a_target_stays_undecided() {
    // Two nanometres beyond the end of the arm: more than a posture may miss by, less than the
    // core's integers can tell.
    let folder = Folder::new("status_3").with(
        "m.toml",
        "[[joint]]\nname = \"a\"\nkind = \"revolute\"\n[[tip]]\nname = \"end\"\nxyz = [1, 0, 0]\n",
    );
    let edge = r#"{"id":"edge","xyz":[1.000000002,0,0],"xyz_within":0}"#;
    let run = folder.run_with(&["decide", "m.toml", "-", "--json"], edge);
    let row = &rows(&run)[0];
    assert_eq!(row["verdict"], "undecided");
    assert!(!row["reason"].as_str().unwrap().is_empty());
    assert_eq!(run.status, 3);
    let both = [edge, r#"{"xyz":[3,0,0],"xyz_within":0}"#].join("\n");
    assert_eq!(
        folder
            .run_with(&["decide", "m.toml", "-", "--json"], &both)
            .status,
        1
    );
}

#[test]
fn status_4_when_a_file_cannot_be_read() {
    let folder = orchard("status_4").with("t.jsonl", NEAR);
    let run = folder.run(&["decide", "absent.toml", "t.jsonl"]);
    assert_eq!((run.status, run.out.as_str()), (4, ""));
    assert_eq!(
        run.err,
        "absent.toml: No such file or directory (os error 2)\n"
    );
    let run = folder.run(&["decide", "m.toml", "absent.jsonl"]);
    assert_eq!((run.status, run.out.as_str()), (4, ""));
    assert_eq!(
        run.err,
        "absent.jsonl: No such file or directory (os error 2)\n"
    );
    let run = folder.run(&["decide", "m.toml", "."]);
    assert_eq!(
        (run.status, run.err.as_str()),
        (4, ".: Is a directory (os error 21)\n")
    );
}

#[test]
fn status_4_when_a_target_is_wrong_and_the_others_are_answered() {
    assert_eq!(status("status_4_line", "decide", &[WRONG, NEAR]), 4);
    assert_eq!(status("status_4_both", "decide", &[FAR, WRONG]), 4);
}

#[test]
fn status_4_when_no_tip_of_the_machine_can_be_packed() {
    let folder = Folder::new("status_4_pack").with("t.jsonl", NEAR).with(
        "m.toml",
        "[[joint]]\nname = \"a\"\nkind = \"fixed\"\n[[tip]]\nname = \"end\"\n",
    );
    let run = folder.run(&["decide", "m.toml", "t.jsonl"]);
    assert_eq!((run.status, run.out.as_str()), (4, ""));
    assert!(run.err.starts_with("m.toml: "), "{}", run.err);
}

#[test]
fn status_5_when_the_output_cannot_be_written() {
    let full = std::fs::OpenOptions::new()
        .write(true)
        .open("/dev/full")
        .unwrap();
    let folder = orchard("status_5").with("t.jsonl", NEAR);
    let child = folder
        .command(&["decide", "m.toml", "t.jsonl"])
        .stdout(full)
        .spawn()
        .unwrap();
    let run = finish(child);
    assert_eq!(
        run.err,
        "standard output: No space left on device (os error 28)\n"
    );
    assert_eq!(run.status, 5);
}

#[test]
fn a_closed_pipe_is_a_clean_end() {
    let folder = orchard("closed_pipe").with("t.jsonl", [NEAR; 20_000].join("\n"));
    let mut child = folder
        .command(&["screen", "m.toml", "t.jsonl", "--json"])
        .spawn()
        .unwrap();
    let mut first = String::new();
    BufReader::new(child.stdout.take().unwrap())
        .read_line(&mut first)
        .unwrap();
    assert!(first.starts_with(r#"{"schema":1,"id":"near""#), "{first}");
    let run = finish(child);
    assert_eq!((run.status, run.err.as_str()), (0, ""));
}

#[test]
fn help_tells_statuses_and_cautions() {
    let folder = orchard("help");
    for arguments in [
        &["--help"][..],
        &["decide", "--help"],
        &["screen", "--help"],
        &["audit", "--help"],
    ] {
        let run = folder.run(arguments);
        assert_eq!((run.status, run.err.as_str()), (0, ""));
        for part in [
            "Exit status:",
            "5  a fault",
            "not a safety function",
            "no performance level",
        ] {
            assert!(run.out.contains(part), "{arguments:?}: {part}");
        }
    }
}

#[test]
fn decide_rows_have_the_promised_fields() {
    let folder = orchard("decide_rows");
    let input = [NEAR, FAR, &NEAR.replace(r#""id":"near","#, "")].join("\n");
    let run = folder.run_with(&["decide", "m.toml", "-", "--json"], &input);
    let rows = rows(&run);
    let ids: Vec<&str> = rows.iter().map(|row| row["id"].as_str().unwrap()).collect();
    assert_eq!(ids, ["near", "far", "3"]);
    let [reachable, unreachable, _] = rows.as_slice() else {
        panic!("{rows:?}")
    };
    for row in [reachable, unreachable] {
        assert_eq!(row["schema"], 1);
        assert!(row["nodes"].as_u64().unwrap() >= 1 && row["seconds"].as_f64().unwrap() >= 0.0);
    }
    assert_eq!(reachable["verdict"], "reachable");
    let names: Vec<&String> = reachable["joints"].as_object().unwrap().keys().collect();
    assert_eq!(names, ["bend", "lift", "nod", "roll", "turn", "twist"]);
    assert_eq!(unreachable["verdict"], "unreachable");
    let proof = unreachable["proof"].as_str().unwrap();
    assert!(
        proof.len() == 64 && proof.chars().all(|c| c.is_ascii_hexdigit()),
        "{proof}"
    );
    assert!(unreachable.get("joints").is_none() && reachable.get("proof").is_none());
}

#[test]
fn screen_rows_have_the_promised_fields() {
    let folder = orchard("screen_rows");
    let arguments = ["screen", "m.toml", "-", "--json", "--splits", "4"];
    let rows = rows(&folder.run_with(&arguments, &[NEAR, FAR].join("\n")));
    let [passed, refused, seal] = rows.as_slice() else {
        panic!("{rows:?}")
    };
    assert_eq!(
        (&passed["schema"], &passed["splits"]),
        (&1.into(), &4.into())
    );
    assert_eq!(
        (&passed["id"], &passed["verdict"]),
        (&"near".into(), &"passed".into())
    );
    assert!(!passed["reason"].as_str().unwrap().is_empty());
    assert_eq!(
        (&refused["schema"], &refused["splits"]),
        (&1.into(), &4.into())
    );
    assert_eq!(
        (&refused["id"], &refused["verdict"]),
        (&"far".into(), &"refused".into())
    );
    assert_eq!(seal["schema"], 1);
    for hex in [&refused["record"], &seal["seal"]] {
        let hex = hex.as_str().unwrap();
        assert!(
            hex.len() % 2 == 0 && hex.chars().all(|c| c.is_ascii_hexdigit()),
            "{hex}"
        );
    }
}

#[test]
fn printed_postures_meet_their_targets() {
    let folder = orchard("postures").with("t.jsonl", CAMERA);
    let run = folder.run(&["decide", "m.toml", "t.jsonl", "--json"]);
    let machine = read::machine(ORCHARD.as_bytes(), "m.toml").unwrap();
    let mut reachable = 0;
    for (k, (text, row)) in CAMERA.lines().zip(rows(&run)).enumerate() {
        let line = Line {
            number: k + 1,
            bytes: Some(text.as_bytes().to_vec()),
        };
        let target = read::target(&line, "t.jsonl", &machine).unwrap();
        assert_eq!(row["id"], target.id.as_str());
        if row["verdict"] == "reachable" {
            let values: Vec<f64> = machine
                .joints
                .iter()
                .map(|joint| row["joints"][&joint.name].as_f64().unwrap())
                .collect();
            assert!(meets(&machine, &target, &values, ALLOWANCE), "{row}");
            reachable += 1;
        }
    }
    assert!(
        (80..=120).contains(&reachable),
        "{reachable} of the camera's targets are reachable"
    );
}

/// Rows without the time taken, the one field that may differ between runs.
fn timeless(run: &Run) -> Vec<Value> {
    let mut rows = rows(run);
    for row in &mut rows {
        row.as_object_mut().unwrap().remove("seconds");
    }
    rows
}

#[test]
fn answers_do_not_depend_on_threads() {
    let folder = orchard("threads").with("t.jsonl", [CAMERA; 4].join(""));
    // The rows of a screening end with a seal.
    for (command, count) in [("decide", 800), ("screen", 801)] {
        let with = |threads| {
            let run = folder.run(&[command, "m.toml", "t.jsonl", "--json", "--threads", threads]);
            (run.status, timeless(&run))
        };
        let one = with("1");
        assert_eq!(one.1.len(), count);
        assert_eq!(one, with("2"), "{command}");
        assert_eq!(one, with("7"), "{command}");
    }
}

#[test]
fn either_input_may_be_standard_input() {
    let folder = orchard("stdin").with("t.jsonl", CAMERA);
    let files = folder.run(&["screen", "m.toml", "t.jsonl", "--json"]);
    assert_eq!(
        files,
        folder.run_with(&["screen", "-", "t.jsonl", "--json"], ORCHARD)
    );
    assert_eq!(
        files,
        folder.run_with(&["screen", "m.toml", "-", "--json"], CAMERA)
    );
}

#[test]
fn targets_are_answered_as_they_come() {
    // A program that waits for each answer before it asks again must not wait for ever.
    let folder = orchard("dialogue");
    let mut child = folder
        .command(&["decide", "m.toml", "-", "--json"])
        .stdin(Stdio::piped())
        .spawn()
        .unwrap();
    let mut questions = child.stdin.take().unwrap();
    let mut answers = BufReader::new(child.stdout.take().unwrap()).lines();
    for question in [NEAR, FAR, WRONG] {
        writeln!(questions, "{question}").unwrap();
        let answer: Value = serde_json::from_str(&answers.next().unwrap().unwrap()).unwrap();
        assert!(question.contains(&format!("{}", answer["id"])), "{answer}");
    }
    drop(questions);
    assert_eq!(finish(child).status, 4);
}

#[test]
fn byte_order_marks_and_foreign_line_ends_do_no_harm() {
    let folder = Folder::new("marks")
        .with(
            "m.toml",
            format!("\u{feff}{}", ORCHARD.replace('\n', "\r\n")),
        )
        .with("t.jsonl", format!("\u{feff}{NEAR}\r\n\r\n{FAR}\r\n"));
    let run = folder.run(&["screen", "m.toml", "t.jsonl", "--json"]);
    // Two answers and the seal.
    assert_eq!(
        (run.status, run.err.as_str(), run.out.lines().count()),
        (1, "", 3)
    );
}

#[test]
fn long_lines_are_skipped_without_harm() {
    let long = format!("{{\"id\":\"long\",{}{}", " ".repeat(1 << 20), &NEAR[12..]);
    let folder = orchard("long").with("t.jsonl", [NEAR, &long, FAR].join("\n"));
    let run = folder.run(&["screen", "m.toml", "t.jsonl", "--json"]);
    let verdicts: Vec<Value> = rows(&run)[..3]
        .iter()
        .map(|row| row["verdict"].clone())
        .collect();
    assert_eq!(verdicts, ["passed", "error", "refused"]);
    assert_eq!(run.err, "t.jsonl:2: longer than 65536 bytes\n");
}

#[test]
fn people_get_rows_counts_and_cautions_without_colour() {
    let folder = orchard("people").with("t.jsonl", [NEAR, FAR, WRONG].join("\n"));
    let run = folder.run(&["decide", "m.toml", "t.jsonl"]);
    assert!(!run.out.contains('\u{1b}'), "{}", run.out);
    let starts = [
        "answer       target",
        "reachable    near",
        "unreachable  far",
        "error        wrong",
    ];
    for (line, start) in run.out.lines().zip(starts) {
        assert!(line.starts_with(start), "{line}");
    }
    assert!(
        run.out.contains(": 1 reachable, 1 unreachable, 1 error\n"),
        "{}",
        run.out
    );
    assert!(run.out.contains("not a safety function"), "{}", run.out);
    assert_eq!(run.err, "t.jsonl:3: xyz_within: -1 is negative\n");

    let quiet = folder.run(&["decide", "m.toml", "t.jsonl", "--quiet"]);
    assert_eq!((quiet.err.as_str(), quiet.out.lines().count()), ("", 3));
}

#[test]
fn colour_can_be_forced_and_refused() {
    let folder = orchard("colour").with("t.jsonl", NEAR);
    let coloured = |name: &str| {
        let mut command = folder.command(&["screen", "m.toml", "t.jsonl"]);
        finish(command.env(name, "1").spawn().unwrap())
            .out
            .contains("\u{1b}[32mpassed")
    };
    assert!(coloured("CLICOLOR_FORCE"));
    assert!(!coloured("NO_COLOR"));
}

#[test]
fn ids_cannot_steer_a_terminal() {
    let folder = orchard("steer");
    let line = NEAR.replace("near", "\\u001b[2J");
    let run = folder.run_with(&["screen", "m.toml", "-", "-q"], &line);
    assert!(
        run.out.starts_with("passed       \\u{1b}[2J "),
        "{}",
        run.out
    );
    let run = folder.run_with(&["screen", "m.toml", "-", "--json"], &line);
    assert_eq!(rows(&run)[0]["id"], "\u{1b}[2J");
}
