//! Proofs that were tampered with: none proves what it no longer shows.

use balk_tests::measure::forgeries::{Arms, all};

#[test]
fn no_forged_proof_is_taken_for_a_proof() {
    let arms = Arms::new();
    let cases = arms.cases(12, 3);
    assert_eq!(cases.len(), 12);
    let rows = all(&cases, 1, 3000, 3);
    for row in &rows {
        let lost = row.wrong.first();
        println!(
            "{}: {} tried, {} not read, {} accepted, {} turned",
            row.name, row.tried, row.unread, row.accepted, row.turned
        );
        assert_eq!(lost, None, "{}: {} wrong", row.name, row.wrong.len());
        assert!(row.tried > 0, "nothing tried: {}", row.name);
    }
    let tried: u64 = rows.iter().map(|row| row.tried).sum();
    let turned: u64 = rows.iter().map(|row| row.turned).sum();
    let accepted: u64 = rows.iter().map(|row| row.accepted).sum();
    assert!(accepted > 0 && 4 * accepted < turned, "{accepted}");
    assert!(tried > 50_000 && turned > 5_000, "{tried}, {turned}");
}

#[test]
fn a_known_posture_contradicts_every_proof() {
    let arms = Arms::new();
    for case in arms.cases(24, 5) {
        assert!(case.is_contradicted(), "{}", case.proof.target);
    }
}
