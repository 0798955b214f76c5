//! Certified probabilities of finding a free relativistic particle beyond its light cone.
//!
//! The modules form a chain, each resting only on those before it:
//! [`arithmetic`] → [`functions`].

pub mod arithmetic;
pub mod functions;
pub mod spoil;
