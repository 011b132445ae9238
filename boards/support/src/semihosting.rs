//! Requests to whoever runs the board.

use crate::Status;
use core::arch::asm;
use core::ffi::CStr;
use core::fmt;

const SYS_OPEN: usize = 0x01;
const SYS_WRITE0: usize = 0x04;
const SYS_READ: usize = 0x06;
const SYS_EXIT_EXTENDED: usize = 0x20;
/// Reason of an exit that the program asked for.
const APPLICATION_EXIT: usize = 0x20026;

/// One request. `argument` is a number or points to what `operation` documents.
fn request(operation: usize, argument: usize) -> usize {
    let result;
    // Safety: the request reads and writes only what its argument points to, and every caller
    // passes what the operation wants.
    #[cfg(target_arch = "arm")]
    unsafe {
        asm!("bkpt #0xab", inlateout("r0") operation => result, in("r1") argument);
    }
    // The three instructions are the mark of a request; they must lie in one page.
    #[cfg(target_arch = "riscv32")]
    unsafe {
        asm!(
            ".balign 16",
            ".option push",
            ".option norvc",
            "slli x0, x0, 0x1f",
            "ebreak",
            "srai x0, x0, 7",
            ".option pop",
            inlateout("a0") operation => result,
            in("a1") argument,
        );
    }
    result
}

/// Ends the program with a status.
pub fn exit(status: Status) -> ! {
    let block = [APPLICATION_EXIT, status as usize];
    request(SYS_EXIT_EXTENDED, block.as_ptr() as usize);
    loop {
        core::hint::spin_loop();
    }
}

/// Where programs print.
pub struct Output;

impl fmt::Write for Output {
    fn write_str(&mut self, text: &str) -> fmt::Result {
        // Requests take text that ends in zero.
        let mut piece = [0u8; 64];
        for part in text.as_bytes().chunks(piece.len() - 1) {
            piece[..part.len()].copy_from_slice(part);
            piece[part.len()] = 0;
            request(SYS_WRITE0, piece.as_ptr() as usize);
        }
        Ok(())
    }
}

/// A file of the workstation, read from its start to its end.
pub struct File {
    handle: usize,
    buffer: [u8; 1024],
    at: usize,
    end: usize,
}

impl File {
    /// Opens a file in the folder where the emulator was started; `None` if it cannot be read.
    pub fn open(name: &CStr) -> Option<File> {
        // Mode 1: read bytes.
        let block = [name.as_ptr() as usize, 1, name.count_bytes()];
        let handle = request(SYS_OPEN, block.as_ptr() as usize);
        (handle != usize::MAX).then_some(File {
            handle,
            buffer: [0; 1024],
            at: 0,
            end: 0,
        })
    }

    /// Fills `bytes`; `None` if the file ends before.
    pub fn fill(&mut self, bytes: &mut [u8]) -> Option<()> {
        for byte in bytes {
            if self.at == self.end {
                let wanted = self.buffer.len();
                let block = [self.handle, self.buffer.as_mut_ptr() as usize, wanted];
                // The answer is how many bytes were not read.
                let missing = request(SYS_READ, block.as_ptr() as usize);
                (self.at, self.end) = (0, wanted.saturating_sub(missing));
            }
            *byte = *self.buffer[..self.end].get(self.at)?;
            self.at += 1;
        }
        Some(())
    }

    /// The next bytes; `None` if the file ends before.
    pub fn take<const LENGTH: usize>(&mut self) -> Option<[u8; LENGTH]> {
        let mut bytes = [0; LENGTH];
        self.fill(&mut bytes)?;
        Some(bytes)
    }
}
