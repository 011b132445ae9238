//! Decide tool targets of a jointed machine: reachable with a posture, or proved unreachable.

pub mod model;
