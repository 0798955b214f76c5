//! The quantities that can be asked for.
//!
//! * [`question`]: what all questions have in common.
//! * [`tail`]: the probability of finding a packet beyond a distance outside its light cone.
//! * [`meeting`]: how the intervals of unrelated routes become one answer.
//! * [`packet_tail`]: the same for any packet, with exact inputs.
//! * `gaussian_tail`: what the gaussian packet says to that.
//! * [`peak`]: the largest tail over all times.

mod gaussian_tail;
pub mod meeting;
pub mod packet_tail;
pub mod peak;
pub mod question;
pub mod tail;
mod tail_range;
