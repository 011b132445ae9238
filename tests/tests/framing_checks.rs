//! Published check values of the checksums, the framing and the digest that logs and proofs use.

use balk_core::record::{Frame, Log, read};
use crc::{Algorithm, Crc};
use sha2::{Digest, Sha256};

/// The text every check value of the catalogue is the sum of.
const DIGITS: &[u8] = b"123456789";

fn crc32(algorithm: &'static Algorithm<u32>, bytes: &[u8]) -> u32 {
    Crc::<u32>::new(algorithm).checksum(bytes)
}

fn crc16(algorithm: &'static Algorithm<u16>) -> u16 {
    Crc::<u16>::new(algorithm).checksum(DIGITS)
}

/// The two sums of a record. Cook, *Catalogue of parametrised CRC algorithms* (RevEng), entries
/// CRC-32/ISCSI and CRC-64/XZ.
#[test]
fn sums_of_records_have_their_catalogued_check_values() {
    assert_eq!(crc32(&crc::CRC_32_ISCSI, DIGITS), 0xe306_9283);
    let sum = Crc::<u64>::new(&crc::CRC_64_XZ).checksum(DIGITS);
    assert_eq!(sum, 0x995d_c9bb_df19_39fa);
}

/// The same catalogue: look-alikes, so that a swapped algorithm is found out.
#[test]
fn look_alikes_have_their_catalogued_check_values() {
    assert_eq!(crc32(&crc::CRC_32_ISO_HDLC, DIGITS), 0xcbf4_3926);
    for (algorithm, check) in [
        (&crc::CRC_16_XMODEM, 0x31c3),
        (&crc::CRC_16_IBM_3740, 0x29b1),
        (&crc::CRC_16_KERMIT, 0x2189),
        (&crc::CRC_16_IBM_SDLC, 0x906e),
        (&crc::CRC_16_ARC, 0xbb3d),
        (&crc::CRC_16_MODBUS, 0x4b37),
    ] {
        assert_eq!(crc16(algorithm), check);
    }
    assert_eq!(Crc::<u8>::new(&crc::CRC_8_SMBUS).checksum(DIGITS), 0xf4);
}

/// Satran et al., *Internet Small Computer Systems Interface (iSCSI)*, RFC 3720, 2004, appendix
/// B.4 (values from memory; recomputed bit by bit).
#[test]
fn crc_32c_of_blocks_of_32_bytes() {
    let rising: Vec<u8> = (0..32).collect();
    let sum = |bytes: &[u8]| crc32(&crc::CRC_32_ISCSI, bytes);
    assert_eq!(sum(&[0; 32]), 0x8a91_36aa);
    assert_eq!(sum(&[0xff; 32]), 0x62a8_ab43);
    assert_eq!(sum(&rising), 0x46dd_794e);
}

/// The catalogue's residues: what any text followed by its own sum leaves, before the final
/// complement.
#[test]
fn texts_with_their_sums_leave_the_catalogued_residues() {
    for (algorithm, residue) in [
        (&crc::CRC_32_ISCSI, 0xb798_b438u32),
        (&crc::CRC_32_ISO_HDLC, 0xdebb_20e3),
    ] {
        let sum = crc32(algorithm, DIGITS);
        let whole = [DIGITS, &sum.to_le_bytes()].concat();
        assert_eq!(crc32(algorithm, &whole) ^ !0, residue);
    }
}

/// A record's checksum is the catalogued CRC-32C, not merely one that its reader agrees with.
#[test]
fn a_seal_carries_the_catalogued_checksum() {
    let seal = balk_core::record::Chain::new().seal(0).bytes();
    let (body, sum) = seal.split_last_chunk().unwrap();
    assert_eq!(crc32(&crc::CRC_32_ISCSI, body).to_le_bytes(), *sum);
}

/// Pairs of a text and the same stuffed. Cheshire and Baker, *Consistent overhead byte stuffing*,
/// IEEE/ACM Transactions on Networking 7(2), 1999, 159-172, for the method and the overhead; the
/// examples are common ones, recomputed.
fn stuffed() -> Vec<(Vec<u8>, Vec<u8>)> {
    let range = |from: u8, to: u8| (from..=to).collect::<Vec<u8>>();
    let short: [(&[u8], &[u8]); 7] = [
        (&[], &[1]),
        (&[0], &[1, 1]),
        (&[0, 0], &[1, 1, 1]),
        (&[0, 0x11, 0], &[1, 2, 0x11, 1]),
        (&[0x11, 0x22, 0, 0x33], &[3, 0x11, 0x22, 2, 0x33]),
        (&[0x11, 0x22, 0x33, 0x44], &[5, 0x11, 0x22, 0x33, 0x44]),
        (&[0x11, 0, 0, 0], &[2, 0x11, 1, 1, 1]),
    ];
    let long = [
        (range(1, 0xfe), [&[0xff][..], &range(1, 0xfe)].concat()),
        (range(0, 0xfe), [&[1, 0xff][..], &range(1, 0xfe)].concat()),
        (
            range(1, 0xff),
            [&[0xff][..], &range(1, 0xfe), &[2, 0xff]].concat(),
        ),
        (
            [&range(2, 0xff)[..], &[0]].concat(),
            [&[0xff][..], &range(2, 0xff), &[1, 1]].concat(),
        ),
        (
            [&range(3, 0xff)[..], &[0, 1]].concat(),
            [&[0xfe][..], &range(3, 0xff), &[2, 1]].concat(),
        ),
    ];
    let short = short.map(|(text, stuffed)| (text.to_vec(), stuffed.to_vec()));
    short.into_iter().chain(long).collect()
}

#[test]
fn stuffing_gives_the_published_bytes_and_takes_them_back() {
    for (text, expected) in stuffed() {
        let mut bytes = [0; 300];
        let count = cobs::try_encode(&text, &mut bytes).unwrap();
        assert_eq!(bytes[..count], expected);
        assert!(count <= text.len() + 1 + text.len() / 254);
        let mut back = [0; 300];
        let report = cobs::decode(&expected, &mut back).unwrap();
        assert_eq!(back[..report.frame_size()], text);
    }
}

/// A frame of the log, unstuffed by hand: each count byte tells how far the next zero byte is.
#[test]
fn a_frame_unstuffs_by_the_published_rule() {
    let mut log = Log::<64>::new();
    log.seal().unwrap();
    let mut frame = [0xaa; 64];
    let count = log.read(&mut frame);
    assert_eq!((frame[0], frame[count - 1]), (0, 0));
    let stuffed = &frame[1..count - 1];
    let mut bytes = Vec::new();
    let mut at = 0;
    while at < stuffed.len() {
        let next = at + usize::from(stuffed[at]);
        bytes.extend(&stuffed[at + 1..next]);
        bytes.push(0);
        at = next;
    }
    bytes.pop();
    assert!(matches!(read(&bytes), Ok(Frame::Seal(seal)) if seal.next == 0));
}

/// National Institute of Standards and Technology, *Secure hash standard*, FIPS 180-4, 2015, and
/// its example values.
#[test]
fn sha_256_gives_the_published_digests() {
    let million = vec![b'a'; 1_000_000];
    let long = b"abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq";
    for (text, expected) in [
        (
            &b""[..],
            "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855",
        ),
        (
            b"abc",
            "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad",
        ),
        (
            long,
            "248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1",
        ),
        (
            &million,
            "cdc76e5c9914fb9281a1c7e284d73e67f1809a48a497200e046d39ccc7112cd0",
        ),
    ] {
        let digest = Sha256::digest(text);
        let hex: String = digest.iter().map(|byte| format!("{byte:02x}")).collect();
        assert_eq!(hex, expected);
    }
}
