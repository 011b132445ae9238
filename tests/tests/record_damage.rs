//! A damaged log is never taken for a whole one, and what is whole in it is still read.

use balk_tests::measure::records::{Damage, Reference, SPLITS, print_sizes, see};

const RECORDS: usize = 12;

fn none(what: &str, damage: Damage, least: u64) {
    println!("{what}: {damage:?}");
    assert!(damage.tried >= least, "{damage:?}");
    assert_eq!((damage.undetected, damage.unread), (0, 0), "{damage:?}");
}

#[test]
fn the_whole_log_is_clean() {
    let reference = Reference::new(RECORDS);
    let seen = see(&reference.bytes);
    assert!(seen.clean);
    assert_eq!(seen.records.len(), RECORDS);
    assert_eq!(reference.frames.len(), RECORDS + 1);
}

#[test]
fn no_truncation_goes_unnoticed() {
    none("truncated", Reference::new(RECORDS).truncations(), 800);
}

#[test]
fn no_flipped_bit_goes_unnoticed() {
    none("one bit", Reference::new(RECORDS).flips(), 6_400);
}

#[test]
fn no_two_flipped_bits_of_a_frame_go_unnoticed() {
    // One record of each kind of target: the whole takes nine times as long (`measure`).
    none(
        "two bits of a frame",
        Reference::new(4).pairs_within_frames(),
        500_000,
    );
}

#[test]
fn no_two_flipped_bits_anywhere_go_unnoticed() {
    none(
        "two bits anywhere",
        Reference::new(RECORDS).random_pairs(50_000, 1),
        50_000,
    );
}

#[test]
fn no_burst_goes_unnoticed() {
    none("bursts", Reference::new(RECORDS).bursts(50_000, 2), 50_000);
}

#[test]
fn no_rearrangement_goes_unnoticed() {
    none(
        "deleted, repeated or swapped",
        Reference::new(RECORDS).rearrangements(),
        200,
    );
}

#[test]
fn records_of_six_joints_stay_short() {
    let sizes = print_sizes(100, 7);
    assert_eq!(sizes.len(), 2 * SPLITS.len());
    for (splits, sizes) in sizes {
        assert!(sizes.refused > 50, "{sizes:?}");
        assert!(splits > 8 || sizes.most <= 256, "{sizes:?}");
    }
}
