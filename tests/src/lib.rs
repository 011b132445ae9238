//! One suite for the core, the complete search and the firmware.

pub mod rotation;
