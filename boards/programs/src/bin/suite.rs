//! Screens every case of a file and compares verdict and record with the workstation's, byte by
//! byte.
#![no_std]
#![no_main]

use balk_board_programs::cases::{CaseError, Cases, answer};
use balk_board_programs::screen_entry;
use balk_core::record::{chained, fingerprint, record};
use balk_core::screen::{Verdict, Workspace8};
use support::{Status, program, say};

program!(run);

fn run() -> Status {
    match suite() {
        Ok(true) => Status::Success,
        Ok(false) => Status::Failed,
        Err(error) => {
            say!("cases: {error:?}");
            Status::Failed
        }
    }
}

/// Whether every case came out as on the workstation.
fn suite() -> Result<bool, CaseError> {
    let mut workspace = Workspace8::new();
    let mut cases = Cases::open(c"suite.cases")?;
    let (mut all, mut differ) = (0u32, 0u32);
    while let Some(section) = cases.section()? {
        let machine = &section.machine;
        let identity = fingerprint(machine);
        // A chain over all records, to compare boards by eye.
        let (mut refused, mut digest) = (0, 0);
        for number in 0..section.cases {
            let case = cases.case()?;
            let (target, options) = (&case.record.target, &case.record.options);
            let verdict = screen_entry(machine, target, options, &mut workspace);
            let own = answer(&verdict);
            let mut alike = own == case.answer;
            if let Verdict::Refused(refusal) = &verdict {
                refused += 1;
                let record = record(identity, target, options, refusal);
                alike &= case.bytes() == &*record;
                digest = chained(digest, &record);
            }
            if !alike {
                differ += 1;
                say!(
                    "case {number}: answer {own}, on the workstation {}",
                    case.answer
                );
            }
        }
        all += section.cases;
        say!(
            "machine {identity:016x}: {refused} of {} refused, records {digest:016x}",
            section.cases
        );
    }
    say!("{all} cases, {differ} differ from the workstation");
    Ok(differ == 0 && all > 0)
}
