//! Certified probabilities of finding a free relativistic particle beyond its light cone.
//!
//! The modules form a chain, each resting only on those before it: [`arithmetic`] (balls, exact
//! input, outward output) → [`functions`] → [`packets`] → [`routes`] → [`quantities`] →
//! [`certificate`] and [`report`] → [`command`]. The uncertified [`scout`] stands beside them.

pub mod arithmetic;
pub mod certificate;
pub mod claims;
pub mod command;
pub mod error;
pub mod functions;
pub mod packets;
pub mod quantities;
pub mod report;
pub mod routes;
pub mod scout;
pub mod spoil;
