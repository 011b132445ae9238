//! Runs the program in a folder of its own.

use std::fs;
use std::io::Write;
use std::path::PathBuf;
use std::process::{Command, Stdio};

/// A folder with input files.
pub struct Folder(PathBuf);

/// What a finished run left.
#[derive(Debug, PartialEq, Eq)]
pub struct Run {
    pub status: i32,
    pub out: String,
    pub err: String,
}

impl Folder {
    /// An empty folder named for the test that uses it.
    pub fn new(name: &str) -> Folder {
        let path = PathBuf::from(env!("CARGO_TARGET_TMPDIR")).join(name);
        let _ = fs::remove_dir_all(&path);
        fs::create_dir_all(&path).unwrap();
        Folder(path)
    }

    /// Adds a file.
    pub fn with(self, name: &str, content: impl AsRef<[u8]>) -> Folder {
        fs::write(self.0.join(name), content).unwrap();
        self
    }

    /// The program, to be run here.
    pub fn command(&self, arguments: &[&str]) -> Command {
        let mut command = Command::new(env!("CARGO_BIN_EXE_balk"));
        command
            .current_dir(&self.0)
            .args(arguments)
            .stdin(Stdio::null())
            .stdout(Stdio::piped())
            .stderr(Stdio::piped());
        command
    }

    /// Runs the program here.
    pub fn run(&self, arguments: &[&str]) -> Run {
        finish(self.command(arguments).spawn().unwrap())
    }

    /// Runs the program here with `input` as standard input.
    #[allow(dead_code, reason = "not every file of tests has an input")]
    pub fn run_with(&self, arguments: &[&str], input: &str) -> Run {
        let mut child = self
            .command(arguments)
            .stdin(Stdio::piped())
            .spawn()
            .unwrap();
        child
            .stdin
            .take()
            .unwrap()
            .write_all(input.as_bytes())
            .unwrap();
        finish(child)
    }
}

/// Waits for `child`.
pub fn finish(child: std::process::Child) -> Run {
    let output = child.wait_with_output().unwrap();
    Run {
        status: output.status.code().unwrap(),
        out: String::from_utf8(output.stdout).unwrap(),
        err: String::from_utf8(output.stderr).unwrap(),
    }
}
