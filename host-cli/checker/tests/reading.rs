//! Machine files and target lines: what is accepted, what is not, and what makes a difference.

mod common;

use balk_checker::{Checker, ReadError, Rejection, TargetError, chain_digest};
use sha2::{Digest, Sha256};

use common::{HEADER, MACHINE, STEPS, TARGET, checker, proof};

fn digest(machine: &str) -> [u8; 32] {
    chain_digest(machine, "cup").expect("well written")
}

#[test]
fn a_changed_number_changes_the_digest() {
    let plain = digest(MACHINE);
    for (from, to) in [
        ("0.3]\nlimits", "0.300000000000000000000000001]\nlimits"),
        ("-150, 150", "-150, 151"),
        ("limits_deg = [-140, 140]", "limits = [-2.44, 2.44]"),
        (
            "xyz = [0.4, 0.0, 0.0]",
            "xyz = [0.4, 0.0, 0.0]\naxis = [0, 0, 2]",
        ),
        (
            "xyz = [0.4, 0.0, 0.0]",
            "xyz = [0.4, 0.0, 0.0]\nrpy_deg = [0, 0, 360]",
        ),
        (
            "xyz = [0.4, 0.0, 0.0]",
            "xyz = [0.4, 0.0, 0.0]\ntolerance = { angle = 1e-9 }",
        ),
        (
            "xyz = [0.4, 0.0, 0.0]",
            "xyz = [0.4, 0.0, 0.0]\nfollows = { joint = \"shoulder\" }",
        ),
        ("name = \"cup\"", "name = \"cup\"\nrpy_deg = [1, 0, 0]"),
    ] {
        assert!(MACHINE.contains(from), "{from}");
        assert_ne!(digest(&MACHINE.replacen(from, to, 1)), plain, "{to}");
    }
}

#[test]
fn another_spelling_of_the_same_does_not() {
    let plain = digest(MACHINE);
    for (from, to) in [
        ("0.3]\nlimits", "3e-1]\nlimits"),
        ("-150, 150", "-150.0, +1_5_0"),
        ("name = \"two links\"", "# a remark"),
        ("\"elbow\"", "\"knee\""),
        (
            "xyz = [0.4, 0.0, 0.0]",
            "parent = \"shoulder\"\nxyz = [0.4, 0.0, 0.0]\nrpy = [0, 0, 0]",
        ),
        ("name = \"cup\"", "name = \"cup\"\nparent = \"elbow\""),
        (
            "[[tip]]",
            "[[tip]]\nname = \"hook\"\nparent = \"base\"\n[[tip]]",
        ),
    ] {
        assert!(MACHINE.contains(from), "{from}");
        assert_eq!(digest(&MACHINE.replacen(from, to, 1)), plain, "{to}");
    }
}

#[test]
fn tables_of_link_parameters() {
    let table = |convention: &str, rows: &str| {
        format!("[dh]\nconvention = \"{convention}\"\nangles = \"degrees\"\nrows = [{rows}]\n")
    };
    let standard = table("standard", "{ a = 0.4 }, { a = 0.3, limits = [-140, 140] }");
    let modified = table("modified", "{}, { a = 0.4, limits = [-140, 140] }");
    let tip = "[[tip]]\nname = \"flange\"\nxyz = [0.3, 0, 0]\n";
    let first = Checker::new(&standard, "flange").expect("well written");
    let second = Checker::new(&format!("{modified}{tip}"), "flange").expect("well written");
    // The same arm in two spellings; the first joint is free, so any full turn will do.
    let target = TARGET.replace("0.3]", "0]");
    for checker in [first, second] {
        // No origin is farther than 0.7 m from another.
        let mut proof = proof(HEADER, "step t@1-.x none by in.x 0 t\n");
        proof.machine = checker.digest();
        proof.tip = "flange".to_owned();
        proof.target.clone_from(&target);
        assert_eq!(checker.check(&proof, &target), Err(Rejection::Root(1)));
        proof.root[0] = balk_checker::proof::Span {
            lo: 1_000_000_000_000,
            hi: 7_283_185_307_180,
        };
        assert_eq!(
            checker.check(&proof, &target).map(|report| report.steps),
            Ok(1)
        );
        proof.root[0].hi -= 1;
        assert_eq!(checker.check(&proof, &target), Err(Rejection::Root(1)));
    }
}

#[test]
fn a_follower_narrows_its_leader() {
    // The elbow turns half as far as the shoulder, so that its limits are the shoulder's doubled.
    let follows = "follows = { joint = \"shoulder\", ratio = -0.5, offset_deg = 10 }";
    let machine = MACHINE.replace("[-140, 140]", &format!("[-40, 40]\n{follows}"));
    let checker = Checker::new(&machine, "cup").expect("well written");
    let root = |lo: &str, hi: &str| {
        let header = HEADER.lines().take(2).map(|line| format!("{line}\n"));
        let header = format!("{}root 1 {lo} {hi}\n", header.collect::<String>());
        let mut proof = proof(&header, STEPS);
        proof.machine = checker.digest();
        checker.check(&proof, TARGET)
    };
    // From -60 to 100 degrees.
    assert!(root("-1.047197551197", "1.745329251995").is_ok());
    assert_eq!(
        root("-1.047197551196", "1.745329251995"),
        Err(Rejection::Root(1))
    );
    assert_eq!(
        root("-1.047197551197", "1.745329251994"),
        Err(Rejection::Root(1))
    );
}

#[test]
fn machines_that_are_none() {
    for (from, to, field) in [
        ("kind = \"revolute\"", "kind = \"hinge\"", "joint[0].kind"),
        (
            "kind = \"revolute\"",
            "kind = \"prismatic\"",
            "joint[0].limits_deg",
        ),
        (
            "kind = \"revolute\"",
            "kinds = \"revolute\"",
            "joint[0].kinds",
        ),
        ("xyz = [0.0, 0.0, 0.3]", "xyz = [0.0, 0.0]", "joint[0].xyz"),
        (
            "xyz = [0.0, 0.0, 0.3]",
            "xyz = [0.0, 0.0, inf]",
            "joint[0].xyz",
        ),
        (
            "xyz = [0.0, 0.0, 0.3]",
            "xyz = [0.0, 0.0, 0x10]",
            "joint[0].xyz",
        ),
        (
            "xyz = [0.0, 0.0, 0.3]",
            "xyz = [0.0, 0.0, 1e-999]",
            "joint[0].xyz",
        ),
        (
            "xyz = [0.0, 0.0, 0.3]",
            "axis = [0, 0.0, -0]",
            "joint[0].axis",
        ),
        ("xyz = [0.0, 0.0, 0.3]", "parent = \"elbow\"", "joint"),
        (
            "xyz = [0.0, 0.0, 0.3]",
            "parent = \"wrist\"",
            "joint[0].parent",
        ),
        (
            "xyz = [0.0, 0.0, 0.3]",
            "follows = { joint = \"shoulder\" }",
            "joint",
        ),
        (
            "xyz = [0.0, 0.0, 0.3]",
            "tolerance = { xyz = -1 }",
            "joint[0].tolerance",
        ),
        ("[-150, 150]", "[150, -150]", "joint[0].limits_deg"),
        (
            "[-150, 150]",
            "[-150, 150]\nlimits = [0, 1]",
            "joint[0].limits_deg",
        ),
        ("\"elbow\"", "\"shoulder\"", "joint[1].name"),
        ("\"elbow\"", "\"base\"", "joint[1].name"),
        ("[[tip]]", "[[tips]]", "tips"),
    ] {
        assert!(MACHINE.contains(from), "{from}");
        match Checker::new(&MACHINE.replacen(from, to, 1), "cup").map(|_| ()) {
            Err(ReadError::Field { field: found, .. }) => assert_eq!(found, field, "{to}"),
            other => panic!("{to}: {other:?}"),
        }
    }
    let missing = chain_digest(MACHINE, "hook");
    assert_eq!(missing, Err(ReadError::Tip("hook".to_owned())));
    assert!(matches!(
        chain_digest("[[joint]", "cup"),
        Err(ReadError::Syntax(_))
    ));
}

#[test]
fn targets_that_are_none() {
    let good = proof(HEADER, STEPS);
    let quaternion = r#""quat":[1,0,0,0],"turn_within":1"#;
    let with = |fields: &str| TARGET.replace("0.001}", &format!("0.001,{fields}}}"));
    for (line, field) in [
        (TARGET.replace("0.001}", "-0.001}"), "xyz_within"),
        (TARGET.replace("0.001}", "\"0.001\"}"), "xyz_within"),
        (TARGET.replace("0.001}", "[0.001,0.001]}"), "xyz_within"),
        (TARGET.replace("[0.8,0.0,0.3]", "[0.8,0.0]"), "xyz"),
        (TARGET.replace("\"far\"", "3"), "id"),
        (with("\"turn_within\":1"), "turn_within"),
        (with("\"quat\":[1,0,0,0]"), "turn_within"),
        (with(&quaternion.replace(":1", ":-1")), "turn_within"),
        (with(&quaternion.replace("[1,", "[1.01,")), "quat"),
        (
            with(&format!("{quaternion},\"turn_within_deg\":1")),
            "turn_within",
        ),
        (with(&format!("{quaternion},\"rpy\":[0,0,0]")), "quat"),
        (
            with("\"rotation\":[1,0,0,0,1,0,0,0,-1],\"turn_within\":1"),
            "rotation",
        ),
        (
            with("\"rotation\":[1,0.01,0,0,1,0,0,0,1],\"turn_within\":1"),
            "rotation",
        ),
        (with("\"axis\":[]"), "axis"),
        (
            with("\"axis\":{\"tip\":[0,0,0],\"base\":[0,0,1],\"within\":1}"),
            "axis",
        ),
        (
            with("\"axis\":{\"tip\":[0,0,1],\"base\":[0,0,1]}"),
            "within",
        ),
    ] {
        match checker().check(&good, &line) {
            Err(Rejection::Unread(TargetError::Field { field: found, .. })) => {
                assert_eq!(found, field, "{line}");
            }
            other => panic!("{line}: {other:?}"),
        }
    }
    for line in [
        with("\"roll\":1"),
        with("\"xyz\":[0,0,0]"),
        TARGET.replace('}', ""),
    ] {
        let result = checker().check(&good, &line);
        assert!(
            matches!(result, Err(Rejection::Unread(TargetError::Syntax(_)))),
            "{line}: {result:?}"
        );
    }
}

#[test]
fn the_tip_must_be_clear() {
    let two = MACHINE.replace("[[tip]]", "[[tip]]\nname = \"hook\"\n[[tip]]");
    let checker = Checker::new(&two, "cup").expect("well written");
    let named = TARGET.replace("{", "{\"tip\":\"cup\",");
    let mut proof = proof(HEADER, STEPS);
    assert_eq!(checker.check(&proof, TARGET), Err(Rejection::Tip));
    assert_eq!(checker.check(&proof, &named), Err(Rejection::Target));
    proof.target.clone_from(&named);
    assert!(checker.check(&proof, &named).is_ok());
}

/// The demo's machine and all of its targets are read; a proof without a step proves nothing of
/// them.
#[test]
fn the_demo_is_read() {
    let demo = format!("{}/../demo", env!("CARGO_MANIFEST_DIR"));
    let read = |name: &str| std::fs::read_to_string(format!("{demo}/{name}")).expect("a demo file");
    let checker = Checker::new(&read("orchard.toml"), "gripper").expect("well written");
    // The second, third and fifth axis are y: a quarter turn back about x takes z there.
    let along_z = [1, 0, 0, 0];
    let along_y = [1, -1, 0, 0];
    let turns = [along_z, along_y, along_y, along_z, along_y, along_z];
    let frame = |turn| balk_checker::proof::Frame { turn, shift: 0 };
    let mut proof = proof(HEADER, "");
    proof.machine = checker.digest();
    proof.tip = "gripper".to_owned();
    proof.frames = turns.map(frame).to_vec();
    let span = balk_checker::proof::Span {
        lo: -5_000_000_000_000,
        hi: 5_000_000_000_000,
    };
    proof.root = vec![span; 6];
    let targets = read("camera.jsonl");
    assert!(targets.lines().count() > 100);
    for line in targets.lines() {
        proof.target = line.to_owned();
        assert_eq!(checker.check(&proof, line), Err(Rejection::Unclosed(1)));
    }
}

/// The spelling of section 9 is part of the format: old proofs must stay valid.
#[test]
fn the_digest_stays_as_it_is() {
    let zero = "rpy 0/1 rad 0/1 rad 0/1 rad";
    let joint = format!("{zero} tolerance 0/1 0/1 rad axis 0/1 0/1 1/1");
    let follows = "ratio 1/1 offset 0/1 rad";
    let written = format!(
        "revolute frames xyz 0/1 0/1 3/10 {joint} variable 1 {follows}\n\
         revolute frames xyz 2/5 0/1 0/1 {joint} variable 2 {follows}\n\
         tip frames xyz 3/10 0/1 0/1 {zero}\n\
         variable 1 limits -150/1 deg 150/1 deg {follows}\n\
         variable 2 limits -140/1 deg 140/1 deg {follows}\n"
    );
    assert_eq!(digest(MACHINE), <[u8; 32]>::from(Sha256::digest(written)));
}
