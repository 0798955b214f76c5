//! The quantities that can be asked for.
//!
//! * [`tail`]: the probability of finding a packet beyond a distance outside its light cone.

pub mod tail;
mod tail_range;
