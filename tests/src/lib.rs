//! One suite for the core, the complete search and the firmware.

pub mod families;
pub mod random;
pub mod rotation;
pub mod truth;

/// Measurements: each prints a table or is run by a test.
pub mod measure {
    pub mod ablation;
    pub mod base_frame;
    pub mod containment;
    pub mod families;
    pub mod forgeries;
    pub mod kernel;
    pub mod lifted;
    pub mod proofs;
    pub mod records;
    pub mod simplex;
    pub mod soundness;
}
