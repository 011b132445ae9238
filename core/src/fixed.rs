//! Fixed point.
