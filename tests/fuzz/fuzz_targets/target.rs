//! Reads target lines. What is accepted must pack into integers within the ranges that the core
//! documents, which is when a record of the packed target reads back.
#![no_main]

use balk::model::Orientation;
use balk::pack::pack_target;
use balk::read::{Line, target};
use balk_core::propagate::Rules;
use balk_core::record::{Frame, Record, read};
use balk_core::screen::{Options, Step};
use balk_fuzz::{MACHINES, SOLVERS};
use libfuzzer_sys::fuzz_target;

fuzz_target!(|bytes: &[u8]| {
    let line = Line {
        number: 1,
        bytes: Some(bytes.to_vec()),
    };
    for (machine, solver) in MACHINES.iter().zip(SOLVERS.iter()) {
        let read_target = match target(&line, "targets", machine) {
            Ok(target) => target,
            Err((_, defect)) => {
                assert!(defect.to_string().starts_with("targets:1"));
                continue;
            }
        };
        assert!(
            read_target
                .xyz
                .iter()
                .chain(&read_target.xyz_within)
                .all(|x| x.is_finite())
        );
        assert!(read_target.xyz_within.iter().all(|x| *x >= 0.0));
        if let Orientation::Near { within, .. } = read_target.orientation {
            assert!(within >= 0.0);
        }
        let record = Record {
            sequence: 0,
            digest: 0,
            fingerprint: 0,
            options: Options {
                rules: Rules::ALL,
                ..Options::default()
            },
            target: pack_target(&read_target, solver.pack.scale),
            steps: [Step::Bounds].into_iter().collect(),
        };
        let written = record.bytes();
        match read(&written) {
            Ok(Frame::Record(again)) => assert_eq!(again.bytes(), written),
            other => panic!("a packed target is out of range: {other:?}"),
        }
    }
});
