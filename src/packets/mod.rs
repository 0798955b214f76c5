//! The wave packets whose localization is asked about.
//!
//! One file for each kind; a packet knows its shape in exact numbers and its name, and nothing of
//! how probabilities are computed.

pub mod box_packet;
pub mod gaussian;

pub use box_packet::BoxPacket;
pub use gaussian::GaussianPacket;
