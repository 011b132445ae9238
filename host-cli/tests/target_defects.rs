//! Every way in which a target line can be wrong is told with file, line, field and reason, and
//! the other lines are still answered.

mod common;

use common::Folder;
use serde_json::Value;

const MACHINE: &str = r#"
[[joint]]
name = "a"
kind = "revolute"
[[tip]]
name = "end"
xyz = [1, 0, 0]
"#;

const SOUND: &str =
    r#"{"id":"t","tip":"end","xyz":[1,0,0],"xyz_within":1,"quat":[1,0,0,0],"turn_within":4}"#;

/// The line `text` between two sound ones is told to have `field` wrong for `reason`.
fn assert_told(name: &str, text: impl AsRef<[u8]>, id: &str, field: &str, reason: &str) {
    let lines = [SOUND.as_bytes(), text.as_ref(), SOUND.as_bytes()].join(&b'\n');
    let folder = Folder::new(&format!("target_{name}"));
    let folder = folder.with("m.toml", MACHINE).with("t.jsonl", lines);
    let run = folder.run(&["decide", "m.toml", "t.jsonl", "--json"]);
    let path = if field.is_empty() {
        String::new()
    } else {
        format!("{field}: ")
    };
    assert_eq!(run.err, format!("t.jsonl:2: {path}{reason}\n"), "{name}");
    assert_eq!(run.status, 4, "{name}");
    let rows: Vec<Value> = run
        .out
        .lines()
        .map(|row| serde_json::from_str(row).unwrap())
        .collect();
    let verdicts: Vec<&str> = rows
        .iter()
        .map(|row| row["verdict"].as_str().unwrap())
        .collect();
    assert_eq!(verdicts, ["reachable", "error", "reachable"], "{name}");
    let row = &rows[1];
    assert_eq!(row["schema"], 1, "{name}");
    assert_eq!(
        (row["id"].as_str(), row["line"].as_u64()),
        (Some(id), Some(2)),
        "{name}"
    );
    assert_eq!(row["field"].as_str().unwrap_or_default(), field, "{name}");
    assert_eq!(
        (row["file"].as_str(), row["reason"].as_str()),
        (Some("t.jsonl"), Some(reason))
    );
}

/// One test a case: a piece of the sound line, what stands there instead, the field, the reason;
/// `$id` is the id that is told.
macro_rules! cases {
    ($id:expr; $($name:ident: $from:expr => $to:expr, $field:expr, $reason:expr;)*) => {$(
        #[test]
        fn $name() {
            assert!(SOUND.contains($from), "{:?} is not in the sound line", $from);
            assert_told(stringify!($name), SOUND.replacen($from, $to, 1), $id, $field, $reason);
        }
    )*};
}

const QUAT: &str = r#""quat":[1,0,0,0]"#;
const WITHIN: &str = r#","turn_within":4"#;
const AXIS: &str = r#""axis":{"tip":[0,0,1],"base":[0,0,1],"within":1}"#;

cases! { "t";
    unknown_field: "\"tip\"" => "\"tool\"", "tool",
        "unknown field; known here: id, tip, xyz, xyz_within, quat, rotation, rpy, rpy_deg, \
         turn_within, turn_within_deg, axis";
    unknown_tip: "\"end\"" => "\"hand\"", "tip", "no tip is named \"hand\"; known: end";
    tip_not_a_text: "\"end\"" => "null", "tip", "expected a text, found null";
    no_position: "\"xyz\":[1,0,0]," => "", "xyz", "missing";
    position_of_two: "[1,0,0],\"xyz_within\"" => "[1,0],\"xyz_within\"", "xyz",
        "expected 3 items, found 2";
    position_of_texts: "[1,0,0],\"xyz_within\"" => "[1,0,\"0\"],\"xyz_within\"", "xyz[2]",
        "expected a number, found a text";
    no_box: "\"xyz_within\":1," => "", "xyz_within", "missing";
    negative_box: "\"xyz_within\":1" => "\"xyz_within\":-1", "xyz_within", "-1 is negative";
    negative_side: "\"xyz_within\":1" => "\"xyz_within\":[1,-2,1]", "xyz_within[1]",
        "-2 is negative";
    box_of_two: "\"xyz_within\":1" => "\"xyz_within\":[1,2]", "xyz_within",
        "expected 3 items, found 2";
    long_quaternion: "[1,0,0,0]" => "[1.0011,0,0,0]", "quat", "has norm 1.0011, not 1 within 0.001";
    zero_quaternion: "[1,0,0,0]" => "[0,0,0,0]", "quat", "has norm 0, not 1 within 0.001";
    huge_quaternion: "[1,0,0,0]" => "[1e300,0,0,0]", "quat", "has norm inf, not 1 within 0.001";
    quaternion_of_three: "[1,0,0,0]" => "[0,0,0]", "quat", "expected 4 items, found 3";
    skew_rotation: QUAT => "\"rotation\":[1,0.01,0,0,1,0,0,0,1]", "rotation",
        "is not a rotation: not orthonormal within 0.001";
    singular_rotation: QUAT => "\"rotation\":[1,0,0,1,0,0,0,0,1]", "rotation",
        "is not a rotation: not orthonormal within 0.001";
    huge_rotation: QUAT => "\"rotation\":[1e300,0,0,0,1e300,0,0,0,1e300]", "rotation",
        "is not a rotation: not orthonormal within 0.001";
    reflection: QUAT => "\"rotation\":[1,0,0,0,1,0,0,0,-1]", "rotation",
        "is a reflection, not a rotation";
    nested_rotation: QUAT => "\"rotation\":[[1,0,0],[0,1,0],[0,0,1]]", "rotation",
        "expected 9 items, found 3";
    two_orientations: QUAT => "\"quat\":[1,0,0,0],\"rpy\":[0,0,0]", "rpy",
        "cannot be given together with quat";
    orientation_and_axis: QUAT => &format!("{QUAT},{AXIS}"), "axis",
        "cannot be given together with quat";
    no_turn: WITHIN => "", "turn_within", "missing: an orientation needs turn_within";
    negative_turn: WITHIN => ",\"turn_within_deg\":-4", "turn_within_deg", "-4 is negative";
    turn_twice: WITHIN => ",\"turn_within\":4,\"turn_within_deg\":4", "turn_within_deg",
        "cannot be given together with turn_within";
    turn_without_an_orientation: &format!("{QUAT},") => "", "turn_within",
        "given without an orientation";
    turn_with_an_axis: QUAT => AXIS, "turn_within", "an axis has its own within";
    zero_axis: &format!("{QUAT}{WITHIN}") => &AXIS.replacen("[0,0,1]", "[0,0,0]", 1), "axis.tip",
        "a direction cannot be zero";
    axis_without_an_angle: &format!("{QUAT}{WITHIN}") => &AXIS.replace(",\"within\":1", ""),
        "axis.within", "missing";
    axis_without_a_direction: &format!("{QUAT}{WITHIN}") => &AXIS.replace("\"base\":[0,0,1],", ""),
        "axis.base", "missing";
    negative_cone: &format!("{QUAT}{WITHIN}") => &AXIS.replace("within\":1", "within_deg\":-1"),
        "axis.within_deg", "-1 is negative";
    second_axis_wrong: &format!("{QUAT}{WITHIN}") =>
        "\"axis\":[{\"tip\":[0,0,1],\"base\":[0,0,1],\"within\":1},{\"tip\":[0,0,1]}]",
        "axis[1].base", "missing";
    no_axes: &format!("{QUAT}{WITHIN}") => "\"axis\":[]", "axis", "has no axes";
}

// Where the line is not JSON, its id is not known.
cases! { "2";
    infinite_number: "\"turn_within\":4" => "\"turn_within\":1e999", "turn_within",
        "1e999 is not a finite number";
    negative_infinite_number: "[1,0,0],\"xyz_within\"" => "[1,-1e999,0],\"xyz_within\"", "xyz",
        "-1e999 is not a finite number";
    word_for_no_number: "\"turn_within\":4" => "\"turn_within\": NaN", "turn_within",
        "NaN is not a finite number";
    word_for_infinity: "[1,0,0,0]" => "[1,0,-Infinity,0]", "quat",
        "-Infinity is not a finite number";
    unquoted_word: "\"end\"" => "end", "tip", "not a JSON object: expected value (column 17)";
    field_twice: WITHIN => ",\"turn_within\":4,\"turn_within\":4", "turn_within",
        "not a JSON object: field \"turn_within\" is given twice (column 100)";
}

const BROKEN: &str = "not a JSON object: ";

#[test]
fn id_not_a_text() {
    assert_told(
        "id",
        SOUND.replace("\"t\"", "7"),
        "2",
        "id",
        "expected a text, found a number",
    );
}

#[test]
fn too_many_axes() {
    let cone = r#"{"tip":[0,0,1],"base":[0,0,1],"within":1}"#;
    let axes = format!("\"axis\":[{}]", [cone; 9].join(","));
    let text = SOUND.replace(&format!("{QUAT}{WITHIN}"), &axes);
    let most = balk::read::MAX_CONES;
    assert_told(
        "axes",
        text,
        "t",
        "axis",
        &format!("has 9 axes, more than {most}"),
    );
}

#[test]
fn lines_that_are_not_json() {
    let lines = [
        ("", "[1,2]", "expected a table, found a list".to_owned()),
        (
            "id",
            "{\"id\":",
            format!("{BROKEN}EOF while parsing a value (column 6)"),
        ),
        (
            "",
            "{} {}",
            format!("{BROKEN}trailing characters (column 4)"),
        ),
    ];
    for (k, (field, text, reason)) in lines.iter().enumerate() {
        assert_told(&format!("not_json_{k}"), text, "2", field, reason);
    }
}

#[test]
fn line_broken_inside_a_character() {
    let text = "{\"id\":\"\u{e9}\",\u{e9}}";
    let reason = format!("{BROKEN}key must be a string (column 12)");
    assert_told("character", text, "2", "id", &reason);
}

#[test]
fn binary_line() {
    assert_told(
        "binary",
        [b'{', 0xff, 0xfe, 0],
        "2",
        "",
        "not UTF-8 at byte 2",
    );
}

#[test]
fn deep_line() {
    let reason = format!("{BROKEN}recursion limit exceeded (column 128)");
    assert_told("deep", "[".repeat(60_000), "2", "", &reason);
}

#[test]
fn endless_line() {
    let long = format!("{{\"id\":\"{}\"}}", "x".repeat(1 << 20));
    assert_told("endless", long, "2", "", "longer than 65536 bytes");
}

#[test]
fn a_tip_must_be_named_when_there_are_two() {
    let machine = format!("{MACHINE}\n[[tip]]\nname = \"eye\"\n");
    let folder = Folder::new("two_tips").with("m.toml", machine);
    let line = SOUND.replace("\"tip\":\"end\",", "");
    let run = folder.run_with(&["screen", "m.toml", "-"], &line);
    assert_eq!(run.err, "<stdin>:1: tip: missing: the machine has 2 tips\n");
    assert_eq!(run.status, 4);
}
