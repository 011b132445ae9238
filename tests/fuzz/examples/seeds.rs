//! Writes the seed corpora: `cargo run --example seeds`, in this folder.
//!
//! Good inputs come from the demo and from what the program itself makes of it; bad ones are the
//! good ones cut short, with a byte changed, or with a text replaced.

use std::fs;
use std::io;
use std::path::Path;

use balk::model::Target;
use balk::prove::{Prover, Subject};
use balk::read::{Line, target};
use balk::search::Screening;
use balk_checker::{binary, chain_digest, text};
use balk_core::record::{Chain, RecordBytes};
use balk_fuzz::{FILES, MACHINES, SOLVERS, hex};

const TARGETS: &str = include_str!("../../../host-cli/demo/camera.jsonl");
/// Seeds of each kind taken from the demo.
const EACH: usize = 4;
/// Parts a proof may have.
const PARTS: u64 = 32;

/// Target lines beside those of the demo: every way to write an orientation, and defects.
const LINES: [(&str, &str); 9] = [
    (
        "free",
        r#"{"xyz":[0.4,0.1,0.3],"xyz_within":[0.01,0.02,0]}"#,
    ),
    (
        "quat",
        r#"{"id":"a","xyz":[2,0,0],"xyz_within":0.001,"quat":[1,0,0,0],"turn_within":0.01}"#,
    ),
    (
        "rpy",
        r#"{"xyz":[0.4,0,0.5],"xyz_within":0,"rpy_deg":[0,90,180],"turn_within_deg":5}"#,
    ),
    (
        "rotation",
        r#"{"xyz":[0,0,1],"xyz_within":0.1,"rotation":[0,-1,0,1,0,0,0,0,1],"turn_within":3.2}"#,
    ),
    (
        "axis",
        r#"{"xyz":[0.3,0,0.2],"xyz_within":0.1,"axis":{"tip":[0,0,1],"base":[0,1,-1],"within_deg":10}}"#,
    ),
    (
        "axes",
        r#"{"xyz":[0.3,0,0.2],"xyz_within":0.1,"axis":[{"tip":[0,0,1],"base":[1,0,0],"within":0.2},{"tip":[1,0,0],"base":[0,1,0],"within":0}]}"#,
    ),
    ("bad_number", r#"{"xyz":[1e999,0,0],"xyz_within":0.1}"#),
    (
        "bad_rotation",
        r#"{"xyz":[0,0,0],"xyz_within":0.1,"rotation":[1,0,0,0,1,0,0,0,0],"turn_within":1}"#,
    ),
    (
        "bad_field",
        r#"{"xyz":[0,0,0],"xyz_within":-0.1,"colour":1}"#,
    ),
];

fn write(target: &str, name: &str, bytes: &[u8]) -> io::Result<()> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("seeds")
        .join(target);
    fs::create_dir_all(&folder)?;
    fs::write(folder.join(name), bytes)
}

/// A good input, the same cut short, and the same with one byte changed.
fn write_three(target: &str, name: &str, bytes: &[u8]) -> io::Result<()> {
    write(target, name, bytes)?;
    write(
        target,
        &format!("{name}_cut"),
        &bytes[..bytes.len() * 2 / 3],
    )?;
    let mut changed = bytes.to_vec();
    changed[bytes.len() / 2] ^= 4;
    write(target, &format!("{name}_changed"), &changed)
}

fn machines() -> io::Result<()> {
    let names = ["orchard", "spherical", "offset", "seven"];
    for (name, file) in names.iter().zip(FILES) {
        write("machine", name, file.as_bytes())?;
    }
    let dh = "name = \"d\"\n[dh]\nconvention = \"standard\"\nangles = \"degrees\"\nrows = [\n  \
        { a = 0.3, alpha = 90, d = 0.1, theta = 0, kind = \"revolute\", limits = [-170, 170] },\n  \
        { a = 0.0, alpha = 0, d = 0.2, theta = 0, kind = \"prismatic\", limits = [0, 0.4] },\n]\n\
        [[tip]]\nname = \"t\"\n";
    write("machine", "dh", dh.as_bytes())?;
    let follower = "name = \"f\"\n[[joint]]\nname = \"a\"\nkind = \"prismatic\"\nlimits = [0, 0.5]\n\
        [[joint]]\nname = \"b\"\nkind = \"prismatic\"\nlimits = [-1, 1]\n\
        tolerance = { xyz = 0.001, angle_deg = 180 }\n\
        follows = { joint = \"a\", ratio = -1.5, offset = 0.1 }\n\
        [[tip]]\nname = \"t\"\nparent = \"b\"\nxyz = [0, 0, 0.1]\n";
    write("machine", "follower", follower.as_bytes())?;
    write("machine", "bad_cut", &FILES[0].as_bytes()[..300])?;
    write(
        "machine",
        "bad_kind",
        FILES[0].replace("revolute", "spherical").as_bytes(),
    )?;
    write(
        "machine",
        "bad_loop",
        follower
            .replace("joint = \"a\"", "joint = \"b\"")
            .as_bytes(),
    )
}

/// A target of the demo that a controller refuses.
struct Refused {
    line: &'static str,
    target: Target,
    record: RecordBytes,
}

/// The first of them.
fn refused() -> Vec<Refused> {
    let refuse = |(number, line): (usize, &'static str)| {
        let bytes = Some(line.as_bytes().to_vec());
        let number = number + 1;
        let target = target(&Line { number, bytes }, "targets", &MACHINES[0]).ok()?;
        match SOLVERS[0].screen(&target, 4) {
            Screening::Passed { .. } => None,
            Screening::Refused { record } => Some(Refused {
                line,
                target,
                record,
            }),
        }
    };
    TARGETS
        .lines()
        .enumerate()
        .filter_map(refuse)
        .take(EACH)
        .collect()
}

fn logs(refused: &mut [Refused]) -> io::Result<()> {
    let mut chain = Chain::new();
    for one in refused.iter_mut() {
        chain.add(&mut one.record);
    }
    let seal = chain.seal(0).bytes();
    let (mut frames, mut lines, mut json) = (Vec::new(), String::new(), String::new());
    let items = refused
        .iter()
        .map(|one| ("record", &*one.record))
        .chain([("seal", &seal[..])]);
    for (number, (key, bytes)) in items.enumerate() {
        write_three("record", &format!("{key}_{number}"), bytes)?;
        let mut stuffed = vec![0; cobs::max_encoding_length(bytes.len())];
        let length = cobs::encode(bytes, &mut stuffed);
        frames.push(0);
        frames.extend_from_slice(&stuffed[..length]);
        frames.push(0);
        lines += &format!("0.{number} WARN refused {}\n", hex(bytes));
        json += &format!("{{\"schema\":1,\"{key}\":\"{}\"}}\n", hex(bytes));
    }
    write_three("log", "frames", &frames)?;
    write_three("log", "lines", lines.as_bytes())?;
    write_three("log", "json", json.as_bytes())?;
    write("log", "bad_prose", b"nothing of this is a log\n")
}

fn proofs(refused: &[Refused]) -> io::Result<()> {
    let tip = &MACHINES[0].tips[0].name;
    let digest = chain_digest(FILES[0], tip).expect("the file is good");
    let prover = Prover::new(&MACHINES[0], 0, digest);
    let proofs = refused.iter().filter_map(|one| {
        let subject = Subject {
            target: &one.target,
            line: one.line,
            search: [0; 32],
        };
        prover.prove(&subject, PARTS).ok()
    });
    for (number, proof) in proofs.enumerate() {
        let bytes = binary::write(&proof).expect("a proof can be written");
        write_three("proof_binary", &format!("proof_{number}"), &bytes)?;
        let written = text::write(&proof).expect("a proof can be written");
        write_three("proof_text", &format!("proof_{number}"), written.as_bytes())?;
    }
    Ok(())
}

/// Numbers for the screening: the fields of its input in order.
fn screenings() -> io::Result<()> {
    for seed in 0u8..8 {
        let bytes: Vec<u8> = (0..160u32)
            .map(|k| (k * 37 + k * k * u32::from(seed)) as u8)
            .collect();
        write("screen", &format!("numbers_{seed}"), &bytes)?;
    }
    Ok(())
}

fn main() -> io::Result<()> {
    machines()?;
    for (name, line) in LINES {
        write("target", name, line.as_bytes())?;
    }
    for (number, line) in TARGETS.lines().take(EACH).enumerate() {
        write("target", &format!("camera_{number}"), line.as_bytes())?;
    }
    let mut refused = refused();
    logs(&mut refused)?;
    proofs(&refused)?;
    screenings()
}
