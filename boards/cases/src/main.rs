//! Makes what the programs on the boards read.
//!
//! ```text
//! balk-board-cases suite COUNT FILE   COUNT targets on three arms, with the workstation's answers
//! balk-board-cases bench COUNT FILE   COUNT targets of each kind on the arm of the table
//! balk-board-cases table FILE         that arm as a table in Rust source
//! ```
//! Targets are the same for the same count. The layout of the files is documented where they are
//! read, in `programs/src/cases.rs`.

use balk::firmware::firmware;
use balk::pack::pack_target;
use balk::search::Verdict as Decided;
use balk_core::image::image;
use balk_core::record::{Record, RecordBytes, fingerprint, record};
use balk_core::screen::{Options, Reason, Step, Verdict, Workspace8, screen};
use balk_core::target::Target;
use balk_tests::families::{Family, Kind};
use std::error::Error;
use std::process::ExitCode;

/// The arm of `bench` and of the table.
const ARM: &str = "spherical";
/// Node budget of the complete search that tells unreachable targets.
const NODES: u64 = 10_000;
/// What the complete search found, as a byte of a case.
const UNKNOWN: u8 = 0;
const REACHABLE: u8 = 1;
const UNREACHABLE: u8 = 2;

fn main() -> ExitCode {
    let arguments: Vec<String> = std::env::args().skip(1).collect();
    let arguments: Vec<&str> = arguments.iter().map(String::as_str).collect();
    let made = match arguments[..] {
        ["suite", count, file] => suite(count).map(|bytes| (file, bytes)),
        ["bench", count, file] => bench(count).map(|bytes| (file, bytes)),
        ["table", file] => table().map(|bytes| (file, bytes)),
        _ => Err("usage: suite COUNT FILE | bench COUNT FILE | table FILE".into()),
    };
    let done = made.and_then(|(file, bytes)| Ok(std::fs::write(file, bytes)?));
    match done {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) => {
            eprintln!("{error}");
            ExitCode::FAILURE
        }
    }
}

fn table() -> Result<Vec<u8>, Box<dyn Error>> {
    let firmware = firmware(&Family::read(ARM).machine, 0)?;
    eprint!("{}", firmware.summary);
    Ok(firmware.source.into_bytes())
}

fn suite(count: &str) -> Result<Vec<u8>, Box<dyn Error>> {
    let count: usize = count.parse()?;
    let arms = Family::all();
    let mut bytes = Vec::new();
    for (index, arm) in arms.iter().enumerate() {
        let own = count / arms.len() + usize::from(index < count % arms.len());
        section(&mut bytes, arm, own)?;
        for number in 0..own {
            let kind = number % Kind::ALL.len();
            let (splits, pivots) = budget(number / Kind::ALL.len());
            let targets = arm.targets(Kind::ALL[kind], 1, number as u64);
            let options = Options {
                splits,
                pivots,
                ..Options::default()
            };
            for target in targets {
                let packed = pack_target(&target, arm.solver.pack.scale);
                case(&mut bytes, arm, &packed, &options, kind as u8, UNKNOWN)?;
            }
        }
    }
    bytes.extend([0, 0]);
    Ok(bytes)
}

/// Splits and pivots of the suite's targets in turn. More splits take far longer on an emulated
/// board: two in 64 have them.
fn budget(number: usize) -> (u16, u16) {
    match number % 64 {
        0 => (8, 200),
        1 => (4, 200),
        even if even % 2 == 0 => (1, 200),
        _ => (1, 0),
    }
}

fn bench(count: &str) -> Result<Vec<u8>, Box<dyn Error>> {
    let count: usize = count.parse()?;
    let arm = Family::read(ARM);
    let mut bytes = Vec::new();
    section(&mut bytes, &arm, count * Kind::ALL.len())?;
    for (kind, &of) in Kind::ALL.iter().enumerate() {
        for target in arm.targets(of, count, 3) {
            let truth = match arm.solver.decide(&target, NODES).verdict {
                Decided::Reachable { .. } => REACHABLE,
                Decided::Undecided { .. } => UNKNOWN,
                Decided::Unreachable { .. } => UNREACHABLE,
            };
            let packed = pack_target(&target, arm.solver.pack.scale);
            case(
                &mut bytes,
                &arm,
                &packed,
                &Options::default(),
                kind as u8,
                truth,
            )?;
        }
    }
    bytes.extend([0, 0]);
    Ok(bytes)
}

fn section(bytes: &mut Vec<u8>, arm: &Family, cases: usize) -> Result<(), Box<dyn Error>> {
    let image = image(&arm.solver.pack.machine);
    bytes.extend(u16::try_from(image.len())?.to_le_bytes());
    bytes.extend(&image);
    bytes.extend(u32::try_from(cases)?.to_le_bytes());
    Ok(())
}

fn case(
    bytes: &mut Vec<u8>,
    arm: &Family,
    target: &Target,
    options: &Options,
    kind: u8,
    truth: u8,
) -> Result<(), Box<dyn Error>> {
    let machine = &arm.solver.pack.machine;
    let (answer, record) = answer(machine, target, options);
    bytes.extend([kind, truth, answer, u8::try_from(record.len())?]);
    bytes.extend(&*record);
    Ok(())
}

/// The answer as the byte of a case, and the record: of a target that passed one with an invented
/// tree, which carries target and options.
fn answer(machine: &balk::pack::Packed, target: &Target, options: &Options) -> (u8, RecordBytes) {
    let mut workspace = Workspace8::new();
    let identity = fingerprint(machine);
    let answer = match screen(machine, target, options, &mut workspace) {
        Verdict::Refused(refusal) => return (0, record(identity, target, options, &refusal)),
        Verdict::Passed(Reason::Capacity) => 1,
        Verdict::Passed(Reason::NothingFound) => 2,
        Verdict::Passed(Reason::PivotBudget) => 3,
        Verdict::Passed(Reason::SplitBudget) => 4,
        Verdict::Passed(Reason::OutOfRange) => 5,
    };
    let carrier = Record {
        sequence: 0,
        digest: 0,
        fingerprint: identity,
        options: *options,
        target: target.clone(),
        steps: [Step::Bounds].into_iter().collect(),
    };
    (answer, carrier.bytes())
}
