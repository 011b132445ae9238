//! From reset to the program, and what happens on a fault.

use crate::{Output, Status, exit};
use core::fmt::Write;

unsafe extern "Rust" {
    /// Made by [`program!`](crate::program).
    safe fn board_program() -> Status;
}

fn faulted() -> ! {
    let _ = Output.write_str("fault\n");
    exit(Status::Faulted)
}

#[cfg(target_arch = "arm")]
mod arm {
    #[cortex_m_rt::entry]
    fn start() -> ! {
        super::exit(super::board_program())
    }

    // Safety: it returns to nowhere and touches no state of the program.
    #[cortex_m_rt::exception]
    unsafe fn HardFault(_frame: &cortex_m_rt::ExceptionFrame) -> ! {
        super::faulted()
    }
}

#[cfg(target_arch = "riscv32")]
mod riscv {
    // Sets the global pointer, the stack and the trap vector, and clears what starts as zero.
    core::arch::global_asm!(
        ".section .text.start, \"ax\"",
        ".globl _start",
        "_start:",
        ".option push",
        ".option norelax",
        "la gp, __global_pointer$",
        ".option pop",
        "la sp, _stack_start",
        "la t0, board_fault",
        "csrw mtvec, t0",
        "la t0, __sbss",
        "la t1, __ebss",
        "1:",
        "bgeu t0, t1, 2f",
        "sw zero, 0(t0)",
        "addi t0, t0, 4",
        "j 1b",
        "2:",
        "j board_start",
        ".balign 4",
        ".globl board_fault",
        "board_fault:",
        "la sp, _stack_start",
        "j board_faulted",
    );

    #[unsafe(no_mangle)]
    extern "C" fn board_start() -> ! {
        super::exit(super::board_program())
    }

    #[unsafe(no_mangle)]
    extern "C" fn board_faulted() -> ! {
        super::faulted()
    }
}
