//! A machine for the controller: a table in Rust source and a binary image, from a machine file.
//!
//! The integers are those of [`pack`](crate::pack): rounded outward, so that they enclose every
//! machine within the tolerances of its file.

mod source;

use crate::model::{self, Kind};
use crate::pack::{Pack, PackError, Packed, pack};
use balk_core::fixed::ONE;
use balk_core::image;
use balk_core::record::fingerprint;
use balk_core::screen::{Workspace4, Workspace6, Workspace7, Workspace8};
use std::fmt;

/// A machine packed for the controller, in both forms.
#[derive(Clone, Debug)]
pub struct Firmware {
    /// Rust source of a module with `MACHINE` and `FINGERPRINT`; it needs `balk-core` alone.
    pub source: String,
    /// What [`balk_core::image::load`] takes.
    pub image: Vec<u8>,
    /// What was done, for people.
    pub summary: Summary,
}

/// What packing did.
#[derive(Clone, Debug)]
pub struct Summary {
    /// Name of the machine.
    pub machine: String,
    /// Name of the tip.
    pub tip: String,
    /// Moving joints of the chain.
    pub joints: usize,
    /// Variables that drive them.
    pub variables: usize,
    /// Fixed joints folded into the placements between.
    pub folded: usize,
    /// Identity of the packed machine, as every record states it.
    pub fingerprint: u64,
    /// What a length of one stands for, metres. All lengths are scaled by it.
    pub scale: f64,
    /// How far the packed lengths reach beyond the written ones, at most, metres: tolerances, what
    /// they turn into between two moving joints, and rounding.
    pub widest: f64,
    /// How far the packed rotations reach beyond the written ones, at most, radians.
    pub widest_turn: f64,
    /// Bytes of the image.
    pub image_bytes: usize,
    /// The smallest preset of working memory that holds the machine.
    pub preset: Preset,
}

/// A preset of working memory.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Preset {
    /// Its name in [`balk_core::screen`].
    pub name: &'static str,
    /// What it takes on a 64-bit machine, bytes; no more on a smaller one.
    pub bytes: usize,
}

impl Preset {
    /// The smallest one for a chain of that many moving joints; packing allows no more than the
    /// largest holds.
    pub fn for_joints(joints: usize) -> Preset {
        let (name, bytes) = match joints {
            0..=4 => ("Workspace4", size_of::<Workspace4>()),
            5..=6 => ("Workspace6", size_of::<Workspace6>()),
            7 => ("Workspace7", size_of::<Workspace7>()),
            _ => ("Workspace8", size_of::<Workspace8>()),
        };
        Preset { name, bytes }
    }
}

/// Packs the chain from the base to a tip for the controller.
///
/// # Errors
/// [`PackError`] names the joint or tip and the reason.
pub fn firmware(machine: &model::Machine, tip: usize) -> Result<Firmware, PackError> {
    let Pack {
        machine: packed,
        scale,
        ..
    } = pack(machine, tip)?;
    let tip_name = &machine.tips[tip].name;
    let image = image::image(&packed).to_vec();
    let path = machine.chain(tip);
    let fixed = |joint: &&usize| machine.joints[**joint].kind == Kind::Fixed;
    let (widest, widest_turn) = widest(&packed);
    let unit = 1.0 / f64::from(ONE);
    Ok(Firmware {
        source: source::source(&packed, &machine.name, tip_name),
        summary: Summary {
            machine: machine.name.clone(),
            tip: tip_name.clone(),
            joints: packed.joints.len(),
            variables: packed.variables.len(),
            folded: path.iter().filter(fixed).count(),
            fingerprint: fingerprint(&packed),
            scale,
            widest: widest as f64 * unit * scale,
            widest_turn: widest_turn as f64 * unit,
            image_bytes: image.len(),
            preset: Preset::for_joints(packed.joints.len()),
        },
        image,
    })
}

/// Largest half-width of an origin and largest slack of a rotation, units.
fn widest(machine: &Packed) -> (i64, i64) {
    let placements = machine.joints.iter().map(|joint| &joint.placement);
    placements
        .chain([&machine.tip])
        .fold((0, 0), |(width, turn), placement| {
            let own = placement.origin.iter().map(|bounds| bounds.width());
            let own = (own.max().unwrap_or(0) + 1) / 2;
            (width.max(own), turn.max(placement.turn_slack.into()))
        })
}

impl fmt::Display for Summary {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Summary {
            machine,
            tip,
            joints,
            variables,
            folded,
            fingerprint,
            scale,
            ..
        } = self;
        writeln!(f, "machine      {machine}, tip {tip}")?;
        writeln!(
            f,
            "chain        {joints} moving joints on {variables} variables, {folded} fixed joints folded in"
        )?;
        writeln!(f, "fingerprint  {fingerprint:016x}")?;
        writeln!(
            f,
            "integers     one is {scale} m; lengths rounded outward to {:.1e} m, angles to 4e-9 rad",
            scale / f64::from(ONE)
        )?;
        writeln!(
            f,
            "tolerance    origins within {:.1e} m, rotations within {:.1e} rad of the written ones",
            self.widest, self.widest_turn
        )?;
        writeln!(f, "image        {} bytes", self.image_bytes)?;
        let Preset { name, bytes } = self.preset;
        writeln!(
            f,
            "needs        {name}: at most {bytes} bytes of memory beside the stack"
        )
    }
}
