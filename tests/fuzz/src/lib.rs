//! What the fuzz targets share: the machines they use and the repair of checksums.

use std::sync::LazyLock;

use balk::search::Solver;
use crc::{CRC_32_ISCSI, Crc};

/// Machine files: the demo, and one arm each with six joints, an offset wrist and seven joints.
pub const FILES: [&str; 4] = [
    include_str!("../../../host-cli/demo/orchard.toml"),
    include_str!("../../machines/spherical.toml"),
    include_str!("../../machines/offset.toml"),
    include_str!("../../machines/seven.toml"),
];

/// The machines of [`FILES`], read.
pub static MACHINES: LazyLock<Vec<balk::model::Machine>> = LazyLock::new(|| {
    FILES
        .iter()
        .map(|text| balk::read::machine(text.as_bytes(), "machine").expect("the files are good"))
        .collect()
});

/// A solver for the first tip of each of [`MACHINES`].
pub static SOLVERS: LazyLock<Vec<Solver>> = LazyLock::new(|| {
    MACHINES
        .iter()
        .map(|machine| Solver::new(machine, 0).expect("the machines can be packed"))
        .collect()
});

/// Replaces the last four bytes by the checksum of those before, as records and seals carry it.
///
/// One in 2^32 byte strings has the right checksum, so no fuzzer gets past it by chance.
pub fn repair_checksum(bytes: &mut [u8]) {
    let crc = Crc::<u32>::new(&CRC_32_ISCSI);
    if let Some((body, checksum)) = bytes.split_last_chunk_mut::<4>() {
        *checksum = crc.checksum(body).to_le_bytes();
    }
}

/// Digits of bytes.
pub fn hex(bytes: &[u8]) -> String {
    bytes.iter().map(|byte| format!("{byte:02x}")).collect()
}
