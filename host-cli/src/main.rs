//! The `balk` program; everything it does is in [`balk::cli`].

use std::panic::catch_unwind;
use std::process::ExitCode;

use balk::cli::{Status, run};

fn main() -> ExitCode {
    // The panic itself has already been reported on standard error.
    let status = catch_unwind(|| run(std::env::args_os())).unwrap_or(Status::Fault);
    ExitCode::from(status as u8)
}
