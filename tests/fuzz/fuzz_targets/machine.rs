//! Reads machine files. What is accepted and can be packed must give integers within the ranges
//! that the overflow lemmas assume, and the same ones each time.
#![no_main]

use balk::pack::pack;
use balk_core::fixed::{Interval, ONE, ONE_SQUARED};
use balk_core::machine::Placement;
use balk_core::record::fingerprint;
use libfuzzer_sys::fuzz_target;

fn is_unit(interval: &Interval) -> bool {
    -ONE <= interval.lo && interval.lo <= interval.hi && interval.hi <= ONE
}

fn check(placement: &Placement) {
    let rotation = placement.rotation.as_flattened();
    assert!(
        rotation
            .iter()
            .all(|entry| entry.unsigned_abs() <= ONE as u32)
    );
    assert!((1..=ONE + 1).contains(&placement.turn_slack));
    assert!(placement.origin.iter().chain(&placement.back).all(is_unit));
    let (least, most) = (-(1 << 12), ONE_SQUARED - (ONE_SQUARED >> 20));
    let square = placement.square;
    assert!(
        least <= square.lo && square.lo <= square.hi && square.hi <= most,
        "{square:?}"
    );
}

fuzz_target!(|bytes: &[u8]| {
    let machine = match balk::read::machine(bytes, "machine") {
        Ok(machine) => machine,
        Err(defect) => {
            assert!(defect.to_string().starts_with("machine"));
            return;
        }
    };
    for tip in 0..machine.tips.len() {
        let Ok(packed) = pack(&machine, tip) else {
            continue;
        };
        let again = pack(&machine, tip).expect("packed before");
        assert_eq!(fingerprint(&packed.machine), fingerprint(&again.machine));
        packed.machine.joints.iter().for_each(|joint| {
            check(&joint.placement);
            assert!((joint.variable as usize) < packed.machine.variables.len());
            assert!(is_unit(&joint.shift));
        });
        check(&packed.machine.tip);
        assert!(
            packed
                .machine
                .variables
                .iter()
                .all(|variable| is_unit(&variable.length))
        );
    }
});
