//! The quantities that can be asked for.
//!
//! * [`question`]: what all questions about one probability have in common.
//! * [`meeting`]: how the intervals of unrelated routes become one answer.
//! * [`catalogue`]: the packets that can be named, each with its routes.
//! * [`tail`]: the probability of finding a box at rest beyond a distance outside its light cone.
//! * [`packet_tail`]: the same for any packet, with exact inputs.
//! * `gaussian_tail`: what the gaussian packet says to that.
//! * [`boosted_tail`]: the box as a moving observer finds it.
//! * [`peak`]: the largest tail over all times.
//! * [`restore`]: from the inputs of a certificate back to its question.
//! * [`density`]: `|psi(x, t)|^2` and the amplitude at points, inside and outside the light cone.
//! * [`propagator`]: the complex propagator `G(x, t)` in one, two and three dimensions.

pub mod boosted_tail;
pub mod catalogue;
pub mod density;
mod gaussian_tail;
pub mod meeting;
pub mod packet_tail;
pub mod peak;
mod piecewise_text;
pub mod pointwise;
pub mod propagator;
pub mod question;
pub mod restore;
pub mod tail;
mod tail_range;
