//! How much stack a piece of work uses.

use core::arch::asm;

/// How far below the caller is painted.
const PAINTED: usize = 48 * 1024;
const PAINT: u32 = 0x5a5a_a5a5;
/// Left out just below the painter's own frame.
const MARGIN: usize = 64;

fn stack_pointer() -> usize {
    let pointer: usize;
    // Safety: reads a register.
    #[cfg(target_arch = "arm")]
    unsafe {
        asm!("mov {}, sp", out(reg) pointer, options(nomem, nostack));
    }
    // Safety: as above.
    #[cfg(target_arch = "riscv32")]
    unsafe {
        asm!("mv {}, sp", out(reg) pointer, options(nomem, nostack));
    }
    pointer
}

/// Bytes of stack below the caller's frame that `work` touches, at least [`MARGIN`]; and what it
/// returns. Looks no further than 48 KiB, which the boards' memory has.
#[inline(never)]
pub fn stack_used<T>(work: impl FnOnce() -> T) -> (usize, T) {
    let top = stack_pointer();
    let painted = || (top - PAINTED..top - MARGIN).step_by(4);
    // Safety: this is unused memory of the stack, below every live frame; the loops keep their
    // values in registers.
    for address in painted() {
        unsafe { (address as *mut u32).write_volatile(PAINT) };
    }
    let result = work();
    let lowest = painted().find(|&address| {
        // Safety: as above.
        unsafe { (address as *const u32).read_volatile() != PAINT }
    });
    (top - lowest.unwrap_or(top - MARGIN), result)
}
