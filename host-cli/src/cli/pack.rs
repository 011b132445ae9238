//! `balk pack`: a machine for the controller.

use std::fs;
use std::path::Path;

use balk_core::image;

use crate::firmware::firmware;

use super::arguments::PackInputs;
use super::output::print;
use super::tally::Status;
use super::{Failure, MachineFile, read_machine};

/// Packs one tip of the machine of `inputs`, writes what is asked for and says what was done.
pub(super) fn run(inputs: &PackInputs) -> Result<Status, Failure> {
    let MachineFile { machine, file, .. } = read_machine(&inputs.machine)?;
    let tip = match &inputs.tip {
        None if machine.tips.len() == 1 => Some(0),
        None => None,
        Some(name) => machine.tips.iter().position(|tip| tip.name == *name),
    };
    let Some(tip) = tip else {
        let names: Vec<&str> = machine.tips.iter().map(|tip| tip.name.as_str()).collect();
        return Err(Failure::Tip {
            file,
            wanted: inputs.tip.clone(),
            names: names.join(", "),
        });
    };
    let packed = firmware(&machine, tip).map_err(|source| Failure::Machine { file, source })?;
    // What is written must load as what was packed.
    image::load::<{ balk_core::propagate::MOST_JOINTS }>(&packed.image)
        .map_err(|error| Failure::Image(error.to_string()))?;
    let mut text = packed.summary.to_string();
    for (path, bytes, what) in [
        (&inputs.source, packed.source.as_bytes(), "source"),
        (&inputs.image, packed.image.as_slice(), "image"),
    ] {
        if let Some(path) = path {
            write(path, bytes)?;
            text.push_str(&format!("wrote        {what} {}\n", path.display()));
        }
    }
    if !inputs.quiet {
        print(&text, false).map_err(Failure::Output)?;
    }
    Ok(Status::Clear)
}

fn write(path: &Path, bytes: &[u8]) -> Result<(), Failure> {
    fs::write(path, bytes).map_err(|source| Failure::Folder {
        folder: path.display().to_string(),
        source,
    })
}
