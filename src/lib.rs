//! Certified probabilities of finding a free relativistic particle beyond its light cone.
//!
//! The modules form a chain, each resting only on those before it: [`arithmetic`] (balls, exact
//! input, outward output) → [`functions`] → [`packets`] → [`routes`] → [`quantities`].

pub mod arithmetic;
pub mod error;
pub mod functions;
pub mod packets;
pub mod quantities;
pub mod routes;
pub mod spoil;
