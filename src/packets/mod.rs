//! The wave packets whose localization is asked about.
//!
//! One file for each kind; a packet knows its shape in exact numbers and its name, and nothing of
//! how probabilities are computed.

pub mod boosted_box;
pub mod box_packet;
pub mod bspline;
pub mod gaussian;
pub mod piecewise;
pub mod waves;

pub use boosted_box::{Boost, BoostedBox};
pub use box_packet::BoxPacket;
pub use bspline::BSplinePacket;
pub use gaussian::GaussianPacket;
pub use piecewise::PiecewisePacket;
pub use waves::{ExactComplex, WavePacket};
