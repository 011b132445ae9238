//! A record beside what the core makes of the same target.

use balk_core::record::Record;

use crate::search::{Screening, Solver};

/// How a record differs from what the core makes of the same target.
#[derive(Clone, Copy, Debug, PartialEq, Eq, thiserror::Error)]
pub enum Mismatch {
    /// The record is of another machine, or another tip.
    #[error("another machine: the fingerprints differ")]
    Machine,
    /// The target passes.
    #[error("verdict differs: the target passes here ({0})")]
    Verdict(&'static str),
    /// The target is refused with another record.
    #[error("bytes differ, from byte {0} of the record on")]
    Bytes(usize),
}

/// Screens the target of a record again, with the options of the record; what comes out must be the
/// record as logged, bit for bit.
///
/// The screening is done by the code a controller runs. That the record replays shows that
/// controller and workstation agree on machine, target, options, verdict and tree. Its number and
/// digest are taken as logged: see [`Continuity`](super::Continuity).
///
/// # Errors
/// See [`Mismatch`].
pub fn replay(solver: &Solver, record: &Record) -> Result<(), Mismatch> {
    if record.fingerprint != solver.fingerprint() {
        return Err(Mismatch::Machine);
    }
    match solver.screen_packed(&record.target, &record.options) {
        Screening::Passed { reason } => Err(Mismatch::Verdict(reason)),
        Screening::Refused { record: mut again } => {
            again.place(record.sequence, record.digest);
            // No other bytes than those logged read as this record.
            let logged = record.bytes();
            if again == logged {
                return Ok(());
            }
            let same = again.iter().zip(&*logged).take_while(|(a, b)| a == b);
            Err(Mismatch::Bytes(same.count()))
        }
    }
}
