//! Records: what the core logs of an arm's refusals, and the same bytes changed in one place with
//! the checksum made right again.

use super::{Corpus, Said, beside, hex, targets};
use balk::log::replay;
use balk::read::{Line, machine, target};
use balk::search::{Screening, Solver};
use balk_core::record::{Chain, Frame, RecordBytes, Seal, read};
use crc::{CRC_32_ISCSI, Crc};

/// Where the fields of a record begin, see `balk_core::record`.
const SEQUENCE: usize = 2;
const DIGEST: usize = 6;
const FINGERPRINT: usize = 14;
const SPLITS: usize = 22;
const PIVOTS: usize = 24;
const RULES: usize = 27;
const POSITION: usize = 28;
const ORIENTATION: usize = 52;
/// Bytes of the checksum.
const CHECKSUM: usize = 4;
/// One, in the core's numbers.
const ONE: i32 = 1 << 30;

/// The bytes with the checksum made right.
fn sealed(body: &[u8]) -> Vec<u8> {
    let checksum = Crc::<u32>::new(&CRC_32_ISCSI).checksum(body);
    [body, &checksum.to_le_bytes()].concat()
}

/// A record's bytes without the checksum.
fn body(record: &[u8]) -> Vec<u8> {
    record[..record.len() - CHECKSUM].to_vec()
}

/// The record with other bytes from a place on.
fn with(record: &[u8], at: usize, bytes: &[u8]) -> Vec<u8> {
    let mut body = body(record);
    body[at..at + bytes.len()].copy_from_slice(bytes);
    sealed(&body)
}

/// What is said of a record.
fn say(solver: &Solver, bytes: &[u8]) -> Said {
    match read(bytes) {
        Err(error) => Said::Malformed(error.to_string()),
        Ok(Frame::Seal(_)) => Said::Accepted,
        Ok(Frame::Record(record)) => match replay(solver, &record) {
            Ok(()) => Said::Accepted,
            Err(mismatch) => Said::Rejected(mismatch.to_string()),
        },
    }
}

pub fn write(corpus: &mut Corpus) {
    let file = beside("arm.toml");
    let arm = machine(file.as_bytes(), "arm.toml").expect("well written");
    let solver = Solver::new(&arm, 0).expect("the arm can be packed");
    let mut put = |class: &str, name: &str, bytes: &[u8]| {
        let rest = format!("# machine: arm\n{}", hex(bytes));
        corpus.write(class, &format!("{name}.hex"), &say(&solver, bytes), &rest);
    };
    let mut chain = Chain::new();
    let mut of = |id: &str, splits: u16| -> Option<RecordBytes> {
        let all = targets("arm");
        let (number, (_, line)) = all.iter().enumerate().find(|(_, (other, _))| other == id)?;
        let written = Line {
            number,
            bytes: Some(line.clone().into_bytes()),
        };
        let target = target(&written, "arm.jsonl", &arm).expect("well written");
        match solver.screen(&target, splits) {
            Screening::Refused { mut record } => {
                chain.add(&mut record);
                Some(record)
            }
            Screening::Passed { .. } => None,
        }
    };
    for (id, _) in targets("arm") {
        for splits in [1, 16] {
            if let Some(record) = of(&id, splits) {
                put("accepted", &format!("{id}-{splits}"), &record);
            }
        }
    }
    let far = of("far", 1).expect("far is refused");
    let cones = of("upward", 16).expect("upward is refused");
    let near = of("turned", 16).expect("turned is refused");
    put(
        "accepted",
        "number-large",
        &with(&far, SEQUENCE, &[0xff; 4]),
    );
    put(
        "accepted",
        "digest-of-another-chain",
        &with(&far, DIGEST, &[1; 8]),
    );
    // The orientation alone is out of reach, and nothing but the rules asked for is used.
    put("accepted", "target-everywhere-cones", &everywhere(&cones));
    for (name, record) in [("far", &far), ("cones", &cones), ("near", &near)] {
        let plain = with(record, RULES, &[0]);
        put("accepted", &format!("rules-none-{name}"), &plain);
    }
    put("accepted", "seal-of-nothing", &Chain::new().seal(0).bytes());
    let seal = Seal {
        next: 7,
        digest: 9,
        lost: 1,
    }
    .bytes();
    put("accepted", "seal", &seal);

    rejected(&mut put, &far, &cones, &near);
    malformed(&mut put, &far, &cones, &near, &seal);
}

/// Where the count of steps lies.
fn steps_at(record: &[u8]) -> usize {
    ORIENTATION
        + match record[ORIENTATION] {
            0 => 1,
            1 => 21,
            _ => 2 + 28 * usize::from(record[ORIENTATION + 1]),
        }
}

/// The record with another tree, given as half bytes.
fn with_steps(record: &[u8], steps: &[u8]) -> Vec<u8> {
    let at = steps_at(record);
    let mut body = record[..at].to_vec();
    body.push(steps.len() as u8);
    body.extend(
        steps
            .chunks(2)
            .map(|pair| pair[0] | pair.get(1).unwrap_or(&0) << 4),
    );
    sealed(&body)
}

/// The record with a position box of all there is.
fn everywhere(record: &[u8]) -> Vec<u8> {
    let axis = [(-ONE).to_le_bytes(), ONE.to_le_bytes()].concat();
    with(record, POSITION, &axis.repeat(3))
}

type Put<'a> = dyn FnMut(&str, &str, &[u8]) + 'a;

fn rejected(put: &mut Put, far: &[u8], cones: &[u8], near: &[u8]) {
    let mut put = |name: &str, bytes: &[u8]| put("rejected", name, bytes);
    for (name, record) in [("far", far), ("cones", cones), ("near", near)] {
        put(
            &format!("machine-another-{name}"),
            &with(record, FINGERPRINT, &[7; 8]),
        );
        let bit = record[FINGERPRINT] ^ 1;
        put(
            &format!("machine-one-bit-{name}"),
            &with(record, FINGERPRINT, &[bit]),
        );
        // A tree that the core does not make.
        put(
            &format!("tree-one-cut-more-{name}"),
            &with_steps(&with(record, SPLITS, &[64, 0]), &[0, 0, 0, 14, 14, 14, 14]),
        );
        put(&format!("tree-by-rows-{name}"), &with_steps(record, &[15]));
        put(
            &format!("tree-empty-range-{name}"),
            &with_steps(&with(record, SPLITS, &[2, 0]), &[3, 15, 15]),
        );
    }
    for (name, record) in [("far", far), ("near", near)] {
        let everywhere = everywhere(record);
        put(&format!("target-everywhere-{name}"), &everywhere);
    }
    put(
        "position-one-axis-free",
        &with(
            far,
            POSITION,
            &[(-ONE).to_le_bytes(), ONE.to_le_bytes()].concat(),
        ),
    );
    let widest = ONE.to_le_bytes();
    put(
        "orientation-any-half-sine",
        &with(near, ORIENTATION + 17, &widest),
    );
    put(
        "quaternion-of-nothing",
        &with(near, ORIENTATION + 1, &[0; 16]),
    );
    let mut free = near[..ORIENTATION].to_vec();
    free.extend([0, 1, 14]);
    put("orientation-left-out", &sealed(&free));
    put(
        "cone-any-half-sine",
        &with(cones, ORIENTATION + 2 + 24, &widest),
    );
    let none = [&cones[..ORIENTATION], &[2, 0, 1, 14]].concat();
    put("cones-left-out", &sealed(&none));
    put(
        "pivots-none-tree-by-rows",
        &with_steps(&with(cones, PIVOTS, &[0, 0]), &[15]),
    );
}

fn malformed(put: &mut Put, far: &[u8], cones: &[u8], near: &[u8], seal: &[u8]) {
    let mut put = |name: &str, bytes: &[u8]| put("malformed", name, bytes);
    let flipped = |record: &[u8], at: usize| {
        let mut bytes = record.to_vec();
        bytes[at] ^= 0x10;
        bytes
    };
    let without = |record: &[u8], count: usize| sealed(&record[..record.len() - CHECKSUM - count]);
    put("nothing", &[]);
    put("kind-alone", &far[..1]);
    put("kind-and-version-alone", &far[..2]);
    put("kind-unknown", &with(far, 0, &[0xb3]));
    put("kind-of-a-seal", &with(far, 0, &[0xb2]));
    put("version-0", &with(far, 1, &[0]));
    put("version-2", &with(far, 1, &[2]));
    put("checksum-of-a-flipped-bit", &flipped(far, 40));
    put("checksum-flipped", &flipped(far, far.len() - 1));
    put("checksum-missing", &far[..far.len() - CHECKSUM]);
    put("cut-in-the-head", &sealed(&far[..20]));
    put("cut-in-the-position", &sealed(&far[..40]));
    put("cut-before-the-orientation", &sealed(&far[..ORIENTATION]));
    put("cut-before-the-steps", &sealed(&far[..ORIENTATION + 1]));
    put("cut-in-a-cone", &sealed(&cones[..ORIENTATION + 20]));
    put("cut-in-a-quaternion", &sealed(&near[..ORIENTATION + 10]));
    put("cut-in-the-steps", &without(far, 1));
    put("byte-too-many", &sealed(&[&body(far)[..], &[0]].concat()));
    put("record-twice", &[far, far].concat());
    put(
        "half-byte-not-zero",
        &with(far, steps_at(far) + 1, &[14 | 0x10]),
    );
    put("orientation-unknown", &with(far, ORIENTATION, &[3]));
    put("rules-unknown", &with(far, RULES, &[0xff]));
    put(
        "position-beyond-one",
        &with(far, POSITION, &(ONE + 2).to_le_bytes()),
    );
    put(
        "position-below-minus-one",
        &with(far, POSITION, &(-ONE - 1).to_le_bytes()),
    );
    put(
        "half-sine-minus",
        &with(near, ORIENTATION + 17, &(-1i32).to_le_bytes()),
    );
    put(
        "half-sine-beyond-one",
        &with(near, ORIENTATION + 17, &(ONE + 1).to_le_bytes()),
    );
    put(
        "cone-half-sine-minus",
        &with(cones, ORIENTATION + 26, &(-1i32).to_le_bytes()),
    );
    put(
        "cone-axis-too-long",
        &with(cones, ORIENTATION + 2, &(ONE + 3).to_le_bytes()),
    );
    put(
        "cone-axis-too-short",
        &with(cones, ORIENTATION + 2, &(ONE - 3).to_le_bytes()),
    );
    put(
        "cone-axis-of-nothing",
        &with(cones, ORIENTATION + 14, &[0; 12]),
    );
    put("cones-more-than-fit", &{
        let mut bytes = cones[..ORIENTATION + 1].to_vec();
        bytes.push(4);
        bytes.extend(cones[ORIENTATION + 2..ORIENTATION + 30].repeat(4));
        bytes.extend([1, 14]);
        sealed(&bytes)
    });
    put(
        "steps-more-than-fit",
        &with_steps(
            &with(far, SPLITS, &[64, 0]),
            &[&[0; 70][..], &[14; 71]].concat(),
        ),
    );
    put("steps-none", &with_steps(far, &[]));
    put(
        "tree-not-closed",
        &with_steps(&with(far, SPLITS, &[8, 0]), &[0, 14]),
    );
    put("tree-closed-twice", &with_steps(far, &[14, 14]));
    put(
        "tree-of-more-parts-than-splits",
        &with_steps(far, &[0, 14, 14]),
    );
    put(
        "tree-of-more-parts-than-no-splits",
        &with_steps(&with(far, SPLITS, &[0, 0]), &[0, 14, 14]),
    );
    put("seal-cut", &sealed(&seal[..seal.len() - CHECKSUM - 1]));
    put(
        "seal-byte-too-many",
        &sealed(&[&body(seal)[..], &[0]].concat()),
    );
    put("seal-checksum", &flipped(seal, 3));
    put("seal-version-3", &with(seal, 1, &[3]));
    put("seal-of-a-record", &with(seal, 0, &[0xb1]));
}
