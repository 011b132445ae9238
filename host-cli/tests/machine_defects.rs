//! Every way in which a machine file can be wrong is told with file, line, field and reason.

mod common;

use common::Folder;

/// A machine with nothing wrong; each case below replaces one piece of it.
const SOUND: &str = r#"name = "sound"
[[joint]]
name = "swing"
kind = "revolute"
limits_deg = [-90, 90]
tolerance = { xyz = 0.001, angle_deg = 0.1 }
[[joint]]
name = "slide"
kind = "prismatic"
axis = [1, 0, 0]
limits = [0, 1]
[[joint]]
name = "hand"
kind = "revolute"
follows = { joint = "swing", ratio = -1.0 }
[[tip]]
name = "end"
parent = "hand"
xyz = [0, 0, 0.1]
rpy_deg = [0, 90, 0]
"#;

const SOUND_TABLE: &str = r#"[dh]
convention = "standard"
angles = "degrees"
rows = [
  { a = 1, alpha = 90, d = 0, theta = 0, limits = [-90, 90] },
  { a = 1, kind = "prismatic", limits = [0, 1] },
]
"#;

const TARGET: &str = r#"{"id":"t","xyz":[0,0,0],"xyz_within":3}"#;

#[test]
fn the_sound_machines_are_accepted() {
    for (name, text) in [("joints", SOUND), ("table", SOUND_TABLE)] {
        let folder = Folder::new(&format!("sound_{name}"));
        let folder = folder.with("m.toml", text).with("t.jsonl", TARGET);
        let run = folder.run(&["screen", "m.toml", "t.jsonl", "--quiet"]);
        assert_eq!((run.status, run.err.as_str()), (0, ""), "{name}: {run:?}");
    }
}

/// Runs `screen` on the machine `text` and requires one message, `expected`, and status 4.
fn assert_told(name: &str, text: impl AsRef<[u8]>, expected: &str) {
    let folder = Folder::new(&format!("machine_{name}"));
    let folder = folder.with("m.toml", text).with("t.jsonl", TARGET);
    let run = folder.run(&["screen", "m.toml", "t.jsonl"]);
    assert_eq!(run.err, format!("{expected}\n"), "{name}");
    assert_eq!((run.status, run.out.as_str()), (4, ""), "{name}");
}

/// One test a case: a piece of `$sound`, what stands there instead, and what is told.
macro_rules! cases {
    ($sound:expr; $($name:ident: $from:expr => $to:expr, $told:expr;)*) => {$(
        #[test]
        fn $name() {
            assert!($sound.contains($from), "{:?} is not in the sound machine", $from);
            assert_told(stringify!($name), $sound.replacen($from, $to, 1), $told);
        }
    )*};
}

cases! { SOUND;
    unknown_field_at_the_top: "name = \"sound\"" => "colour = 1",
        "m.toml:1: colour: unknown field; known here: name, joint, dh, tip";
    unknown_field_of_a_joint: "limits = [0, 1]" => "limits = [0, 1]\nlimts = 3",
        "m.toml:12: joint[1].limts: unknown field; known here: name, kind, parent, xyz, rpy, \
         rpy_deg, axis, limits, limits_deg, tolerance, follows";
    unknown_field_of_a_tolerance: "angle_deg = 0.1" => "angle_grad = 0.1",
        "m.toml:6: joint[0].tolerance.angle_grad: unknown field; known here: xyz, angle, angle_deg";
    unknown_field_of_follows: "ratio = -1.0" => "factor = -1.0",
        "m.toml:15: joint[2].follows.factor: unknown field; known here: joint, ratio, offset, \
         offset_deg";
    unknown_field_of_a_tip: "rpy_deg = [0, 90, 0]" => "rpydeg = [0, 90, 0]",
        "m.toml:20: tip[0].rpydeg: unknown field; known here: name, parent, xyz, rpy, rpy_deg";
    duplicate_joint: "name = \"hand\"" => "name = \"swing\"",
        "m.toml:13: joint[2].name: \"swing\" is already the name of joint[0]";
    duplicate_tip: "[[tip]]" => "[[tip]]\nname = \"end\"\n[[tip]]",
        "m.toml:19: tip[1].name: \"end\" is already the name of tip[0]";
    duplicate_key: "axis = [1, 0, 0]" => "axis = [1, 0, 0]\naxis = [1, 0, 0]",
        "m.toml:11: duplicate key";
    joint_without_a_name: "name = \"slide\"\n" => "", "m.toml:7: joint[1].name: missing";
    joint_with_an_empty_name: "name = \"slide\"" => "name = \"\"",
        "m.toml:8: joint[1].name: a name cannot be empty";
    joint_named_base: "name = \"slide\"" => "name = \"base\"",
        "m.toml:8: joint[1].name: \"base\" is the name of the base";
    joint_name_with_a_control_character: "name = \"slide\"" => "name = \"\\u001b[31m\"",
        "m.toml:8: joint[1].name: a name cannot hold control characters";
    joint_without_a_kind: "kind = \"prismatic\"\n" => "", "m.toml:7: joint[1].kind: missing";
    unknown_kind: "kind = \"prismatic\"" => "kind = \"screw\"",
        "m.toml:9: joint[1].kind: \"screw\" is not one of revolute, prismatic, fixed";
    kind_of_the_wrong_type: "kind = \"prismatic\"" => "kind = 3",
        "m.toml:9: joint[1].kind: expected a text, found a number";
    unknown_parent: "kind = \"prismatic\"" => "kind = \"prismatic\"\nparent = \"arm\"",
        "m.toml:10: joint[1].parent: no joint is named \"arm\"";
    own_parent: "kind = \"prismatic\"" => "kind = \"prismatic\"\nparent = \"slide\"",
        "m.toml:10: joint[1].parent: parents form a cycle: slide -> slide";
    cycle_of_parents: "kind = \"revolute\"\nlimits" => "kind = \"revolute\"\nparent = \"hand\"\nlimits",
        "m.toml:5: joint[0].parent: parents form a cycle: swing -> hand -> slide -> swing";
    reversed_limits: "limits_deg = [-90, 90]" => "limits_deg = [170, -170]",
        "m.toml:5: joint[0].limits_deg: lower limit 170 is above upper limit -170";
    one_limit: "limits = [0, 1]" => "limits = [1]",
        "m.toml:11: joint[1].limits: expected 2 items, found 1";
    limit_not_a_number: "limits_deg = [-90, 90]" => "limits_deg = [\n-90,\nnan]",
        "m.toml:7: joint[0].limits_deg[1]: NaN is not a finite number";
    infinite_limit: "limits = [0, 1]" => "limits = [0, inf]",
        "m.toml:11: joint[1].limits[1]: inf is not a finite number";
    huge_limit: "limits = [0, 1]" => "limits = [0, 1e7]",
        "m.toml:11: joint[1].limits[1]: 10000000 is beyond 1000000 metres";
    limits_twice: "limits_deg = [-90, 90]" => "limits_deg = [-90, 90]\nlimits = [-1, 1]",
        "m.toml:5: joint[0].limits_deg: cannot be given together with limits";
    limits_missing_on_a_prismatic_joint: "limits = [0, 1]\n" => "",
        "m.toml:7: joint[1].limits: missing: a prismatic joint needs limits";
    limits_in_degrees_on_a_prismatic_joint: "limits = [0, 1]" => "limits_deg = [0, 1]",
        "m.toml:11: joint[1].limits_deg: a prismatic joint has limits in metres, not in degrees";
    limits_on_a_fixed_joint: "kind = \"prismatic\"" => "kind = \"fixed\"",
        "m.toml:11: joint[1].limits: a fixed joint has no limits";
    zero_axis: "axis = [1, 0, 0]" => "axis = [0, 0, 0]",
        "m.toml:10: joint[1].axis: a direction cannot be zero";
    axis_of_two_numbers: "axis = [1, 0, 0]" => "axis = [1, 0]",
        "m.toml:10: joint[1].axis: expected 3 items, found 2";
    axis_of_texts: "axis = [1, 0, 0]" => "axis = [1, 0, \"0\"]",
        "m.toml:10: joint[1].axis[2]: expected a number, found a text";
    axis_as_a_word: "axis = [1, 0, 0]" => "axis = \"x\"",
        "m.toml:10: joint[1].axis: expected a list, found a text";
    origin_not_finite: "xyz = [0, 0, 0.1]" => "xyz = [0, 0, -inf]",
        "m.toml:19: tip[0].xyz[2]: -inf is not a finite number";
    origin_far_away: "xyz = [0, 0, 0.1]" => "xyz = [0, 0, 1e300]",
        &format!("m.toml:19: tip[0].xyz[2]: {} is beyond 1000000 metres", 1e300);
    angles_twice: "rpy_deg = [0, 90, 0]" => "rpy_deg = [0, 90, 0]\nrpy = [0, 0, 0]",
        "m.toml:20: tip[0].rpy_deg: cannot be given together with rpy";
    negative_tolerance: "xyz = 0.001" => "xyz = -0.001",
        "m.toml:6: joint[0].tolerance.xyz: -0.001 is negative";
    negative_angle_tolerance: "angle_deg = 0.1" => "angle = -0.1",
        "m.toml:6: joint[0].tolerance.angle: -0.1 is negative";
    tolerance_twice: "angle_deg = 0.1" => "angle_deg = 0.1, angle = 0.1",
        "m.toml:6: joint[0].tolerance.angle_deg: cannot be given together with angle";
    tolerance_as_a_number: "{ xyz = 0.001, angle_deg = 0.1 }" => "0.1",
        "m.toml:6: joint[0].tolerance: expected a table, found a number";
    follows_unknown: "joint = \"swing\"" => "joint = \"arm\"",
        "m.toml:15: joint[2].follows.joint: no joint is named \"arm\"";
    follows_base: "joint = \"swing\"" => "joint = \"base\"",
        "m.toml:15: joint[2].follows.joint: the base does not move";
    follows_itself: "joint = \"swing\"" => "joint = \"hand\"",
        "m.toml:15: joint[2].follows.joint: joints follow each other in a cycle: hand -> hand";
    follows_in_a_cycle: "limits_deg = [-90, 90]" => "follows = { joint = \"hand\" }",
        "m.toml:5: joint[0].follows.joint: joints follow each other in a cycle: swing -> hand \
         -> swing";
    follows_fixed: "kind = \"revolute\"\nlimits_deg = [-90, 90]" => "kind = \"fixed\"",
        "m.toml:14: joint[2].follows.joint: joint \"swing\" is fixed";
    follows_nothing: "joint = \"swing\", " => "",
        "m.toml:15: joint[2].follows.joint: missing";
    fixed_follower: "kind = \"revolute\"\nfollows" => "kind = \"fixed\"\nfollows",
        "m.toml:15: joint[2].follows: a fixed joint cannot follow another";
    offset_twice: "ratio = -1.0" => "offset = 1, offset_deg = 2",
        "m.toml:15: joint[2].follows.offset_deg: cannot be given together with offset";
    offset_in_degrees_on_a_prismatic_joint:
        "limits = [0, 1]" => "limits = [0, 1]\nfollows = { joint = \"swing\", offset_deg = 1 }",
        "m.toml:12: joint[1].follows.offset_deg: a prismatic joint has an offset in metres, not \
         in degrees";
    ratio_not_finite: "ratio = -1.0" => "ratio = nan",
        "m.toml:15: joint[2].follows.ratio: NaN is not a finite number";
    ratio_too_large: "ratio = -1.0" => "ratio = -1e7",
        "m.toml:15: joint[2].follows.ratio: -10000000 is beyond 1000000 times";
    huge_tolerance: "xyz = 0.001" => "xyz = 1e300",
        &format!("m.toml:6: joint[0].tolerance.xyz: {} is beyond 1000000 metres", 1e300);
    tip_on_nothing: "parent = \"hand\"" => "parent = \"wrist\"",
        "m.toml:18: tip[0].parent: no joint is named \"wrist\"";
    tip_without_a_name: "name = \"end\"\n" => "", "m.toml:16: tip[0].name: missing";
    joint_not_a_list: "[[joint]]\nname = \"swing\"" => "[joint]\nname = \"swing\"",
        "m.toml:7: duplicate key";
    broken_syntax: "axis = [1, 0, 0]" => "axis = [1, 0, 0",
        "m.toml:11: missing comma between array elements, expected `,`";
    both_forms: "[[tip]]" => "[dh]\nrows = []\n[[tip]]",
        "m.toml:16: dh: cannot be given together with joint";
    date_instead_of_a_number: "xyz = 0.001" => "xyz = 2020-01-01",
        "m.toml:6: joint[0].tolerance.xyz: expected a number, found a date";
    truth_instead_of_a_number: "xyz = 0.001" => "xyz = true",
        "m.toml:6: joint[0].tolerance.xyz: expected a number, found a truth value";
    integer_too_long: "xyz = 0.001" => "xyz = 99999999999999999999",
        "m.toml:6: joint[0].tolerance.xyz: expected a number, found an integer beyond 64 bits";
}

cases! { SOUND_TABLE;
    table_without_a_convention: "convention = \"standard\"\n" => "",
        "m.toml:1: dh.convention: missing";
    table_of_an_unknown_convention: "\"standard\"" => "\"own\"",
        "m.toml:2: dh.convention: \"own\" is not one of standard, modified";
    table_without_a_unit: "angles = \"degrees\"\n" => "", "m.toml:1: dh.angles: missing";
    table_of_an_unknown_unit: "\"degrees\"" => "\"gon\"",
        "m.toml:3: dh.angles: \"gon\" is not one of degrees, radians";
    table_with_an_unknown_field: "a = 1, alpha" => "length = 1, alpha",
        "m.toml:5: dh.rows[0].length: unknown field; known here: name, a, alpha, d, theta, kind, \
         limits, tolerance";
    table_with_an_infinite_length: "a = 1, alpha" => "a = inf, alpha",
        "m.toml:5: dh.rows[0].a: inf is not a finite number";
    table_with_reversed_limits: "[-90, 90]" => "[90, -90]",
        "m.toml:5: dh.rows[0].limits: lower limit 90 is above upper limit -90";
    table_with_a_prismatic_row_without_limits: "\"prismatic\", limits = [0, 1]" => "\"prismatic\"",
        "m.toml:6: dh.rows[1].limits: missing: a prismatic joint needs limits";
    table_with_a_fixed_row_with_limits: "\"prismatic\"" => "\"fixed\"",
        "m.toml:6: dh.rows[1].limits: a fixed joint has no limits";
    table_with_a_name_twice: "kind = \"prismatic\"" => "name = \"joint1\", kind = \"prismatic\"",
        "m.toml:6: dh.rows[1].name: \"joint1\" is already the name of dh.rows[0]";
    table_with_a_name_taken_by_number: "a = 1, alpha" => "name = \"joint2\", a = 1, alpha",
        "m.toml:6: dh.rows[1].name: \"joint2\" is already the name of dh.rows[0]";
}

#[test]
fn empty_file() {
    assert_told(
        "empty",
        "",
        "m.toml: describes no machine: neither [[joint]] nor [dh]",
    );
}

#[test]
fn standard_input() {
    let folder = Folder::new("machine_stdin").with("t.jsonl", TARGET);
    let run = folder.run_with(&["screen", "-", "t.jsonl"], "\nname = 1");
    assert_eq!(
        run.err,
        "<stdin>:2: name: expected a text, found a number\n"
    );
    assert_eq!((run.status, run.out.as_str()), (4, ""));
}

#[test]
fn binary_file() {
    let bytes: Vec<u8> = (0..=255).cycle().take(4096).collect();
    assert_told("binary", bytes, "m.toml:2: not a text file (invalid UTF-8)");
    assert_told(
        "zeros",
        [0; 64],
        "m.toml:1: key with no value, expected `=`",
    );
}

#[test]
fn endless_file() {
    assert_told(
        "long",
        vec![b'\n'; 2 << 20],
        "m.toml: longer than 1048576 bytes",
    );
}

#[test]
fn no_tip() {
    let joints = &SOUND[..SOUND.find("[[tip]]").unwrap()];
    assert_told("no_tip", joints, "m.toml: has no tip: no [[tip]]");
}

#[test]
fn no_joints() {
    assert_told(
        "no_joints",
        "joint = []\n[[tip]]\nname = \"end\"",
        "m.toml:1: joint: has no joints",
    );
    assert_told(
        "no_rows",
        "[dh]\nconvention = \"standard\"\nangles = \"degrees\"\nrows = []",
        "m.toml:4: dh.rows: has no rows",
    );
}

#[test]
fn too_many_joints() {
    let joints: String = (0..65)
        .map(|k| format!("[[joint]]\nname = \"j{k}\"\nkind = \"revolute\"\n"))
        .collect();
    let text = format!("{joints}[[tip]]\nname = \"end\"");
    assert_told(
        "too_many",
        text,
        "m.toml:1: joint: has 65 joints, more than 64",
    );
}

#[test]
fn messages_cannot_steer_a_terminal() {
    let text = "\"\\u001b[2J\" = 1";
    assert_told(
        "escape",
        text,
        "m.toml:1: \\u{1b}[2J: unknown field; known here: name, joint, dh, tip",
    );
}
