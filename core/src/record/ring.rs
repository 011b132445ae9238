//! The controller's log: a ring of whole frames in fixed memory.

use super::{Chain, MOST_FRAME_BYTES, RECORD_KIND, RecordBytes, SEAL_BYTES};

/// Length of a seal's frame: one stuffed byte and two zero bytes.
const SEAL_FRAME_BYTES: usize = SEAL_BYTES + 3;

// With at most 254 bytes, COBS stuffs one.
const _: () = assert!(MOST_FRAME_BYTES <= 254 + 3);

/// Frames that wait to be sent, in `BYTES` bytes of memory; the newest are kept.
///
/// [`Log::push`] numbers, chains and frames a record, [`Log::read`] hands out bytes for the serial
/// line in pieces of any size, [`Log::seal`] says where the log ends. When the memory is full the
/// oldest whole frames make room, except one that is being sent. Whatever is dropped leaves a gap
/// in the numbers and is counted in the seal: no loss is silent.
///
/// A record of one part takes up to 147 bytes here, typically 82. No heap; `push` costs at most a
/// few operations a byte of the memory.
///
/// ```
/// let mut log = balk_core::record::Log::<1024>::new();
/// // log.push(record(fingerprint, &target, &options, &refusal)); after each refusal
/// log.seal().unwrap();
/// let mut piece = [0; 16];
/// let mut sent = 0;
/// while !log.is_empty() {
///     sent += log.read(&mut piece); // send piece[..count]
/// }
/// assert_eq!(sent, 25);
/// ```
#[derive(Clone, Debug)]
pub struct Log<const BYTES: usize> {
    memory: [u8; BYTES],
    /// Where the oldest byte lies.
    start: usize,
    /// Bytes held.
    length: usize,
    /// Bytes left of the frame being sent.
    sending: usize,
    chain: Chain,
    lost: u32,
}

/// The seal does not fit beside the frame that is being sent.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct NoRoom;

impl<const BYTES: usize> Default for Log<BYTES> {
    fn default() -> Self {
        Self::new()
    }
}

impl<const BYTES: usize> Log<BYTES> {
    /// An empty log.
    pub const fn new() -> Self {
        const {
            assert!(
                BYTES >= SEAL_FRAME_BYTES,
                "enlarge the log: not even a seal fits"
            );
        }
        Log {
            memory: [0; BYTES],
            start: 0,
            length: 0,
            sending: 0,
            chain: Chain::new(),
            lost: 0,
        }
    }

    /// Makes `record` the next of the log; returns its sequence number.
    ///
    /// A record that does not fit at all is counted as lost.
    pub fn push(&mut self, mut record: RecordBytes) -> u32 {
        let sequence = self.chain.add(&mut record);
        let mut buffer = [0; MOST_FRAME_BYTES];
        let frame = frame(&record, &mut buffer);
        if self.make_room(frame.len()) {
            self.append(frame);
        } else {
            self.lost = self.lost.saturating_add(1);
        }
        sequence
    }

    /// Adds a seal: the next sequence number, the digest so far and the records lost. The log may go
    /// on after it.
    ///
    /// # Errors
    /// [`NoRoom`], only in a log smaller than a longest frame and a seal; to be tried again once
    /// more has been sent.
    pub fn seal(&mut self) -> Result<(), NoRoom> {
        if !self.make_room(SEAL_FRAME_BYTES) {
            return Err(NoRoom);
        }
        // After making room, so that what was dropped for it is counted.
        let seal = self.chain.seal(self.lost);
        let mut buffer = [0; SEAL_FRAME_BYTES];
        self.append(frame(&seal.bytes(), &mut buffer));
        Ok(())
    }

    /// Takes up to `piece.len()` bytes off the log, to be sent in this order; returns how many.
    pub fn read(&mut self, piece: &mut [u8]) -> usize {
        let count = piece.len().min(self.length);
        for to in piece.iter_mut().take(count) {
            if self.sending == 0 {
                self.sending = self.frame_bytes(0);
            }
            *to = self.at(0);
            self.skip(1);
            self.sending = self.sending.saturating_sub(1);
        }
        count
    }

    /// Whether every byte has been read.
    pub fn is_empty(&self) -> bool {
        self.length == 0
    }

    /// Records lost since the start: pushed, but dropped before they were read.
    pub fn lost(&self) -> u32 {
        self.lost
    }

    /// Drops the oldest whole frames until `count` more bytes fit; false, and nothing dropped, when
    /// they never will.
    fn make_room(&mut self, count: usize) -> bool {
        if self.sending + count > BYTES {
            return false;
        }
        while self.length + count > BYTES {
            self.evict();
        }
        true
    }

    /// Drops the oldest frame of which nothing has been sent.
    fn evict(&mut self) {
        let count = self.frame_bytes(self.sending);
        // A zero byte, the first stuffed byte, the kind.
        if self.at(self.sending + 2) == RECORD_KIND {
            self.lost = self.lost.saturating_add(1);
        }
        // What is left of the frame being sent moves up to the one after.
        for offset in (0..self.sending).rev() {
            let byte = self.at(offset);
            self.set(offset + count, byte);
        }
        self.skip(count);
    }

    /// Length of the frame that begins at `offset`: from its first zero byte to its second.
    fn frame_bytes(&self, offset: usize) -> usize {
        let inside = (offset + 1..self.length).take_while(|at| self.at(*at) != 0);
        (inside.count() + 2).min(self.length.saturating_sub(offset))
    }

    fn append(&mut self, bytes: &[u8]) {
        for byte in bytes {
            self.set(self.length, *byte);
            self.length += 1;
        }
    }

    fn skip(&mut self, count: usize) {
        self.start = (self.start + count) % BYTES;
        self.length = self.length.saturating_sub(count);
    }

    fn at(&self, offset: usize) -> u8 {
        let place = self.memory.get((self.start + offset) % BYTES);
        place.copied().unwrap_or_default()
    }

    fn set(&mut self, offset: usize, byte: u8) {
        if let Some(place) = self.memory.get_mut((self.start + offset) % BYTES) {
            *place = byte;
        }
    }
}

/// The frame of `bytes`, in `buffer`, which is zero and holds three bytes more.
fn frame<'b>(bytes: &[u8], buffer: &'b mut [u8]) -> &'b [u8] {
    let inside = buffer.get_mut(1..).unwrap_or_default();
    // The buffer is large enough for any record and for a seal.
    let stuffed = cobs::try_encode(bytes, inside).unwrap_or_default();
    buffer.get(..stuffed + 2).unwrap_or_default()
}
