//! The quantities that can be asked for.
//!
//! * [`tail`]: the probability of finding a packet beyond a distance outside its light cone.
//! * [`density`]: `|psi(x, t)|^2` and the amplitude at points, inside and outside the light cone.
//! * [`propagator`]: the complex propagator `G(x, t)` in one, two and three dimensions.

pub mod density;
pub mod pointwise;
pub mod propagator;
pub mod tail;
mod tail_range;
