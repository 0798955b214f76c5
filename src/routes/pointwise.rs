//! Routes to a complex number that belongs to a point: propagators and amplitudes.

use super::{Effort, RouteFailure};
use crate::arithmetic::{Bits, Complex};

/// One way to one complex number, with the question built in.
pub trait PointEvaluation: Sync {
    /// Name in results: `closed form`, `momentum`, ...
    fn name(&self) -> &'static str;

    /// One sentence on the method.
    fn method(&self) -> &'static str;

    /// An enclosure computed so that about `digits` digits relative to the absolute value may be hoped for; the width
    /// is the caller's to check.
    ///
    /// # Errors
    /// [`RouteFailure`] if the effort does not suffice or the problem is out of reach.
    fn evaluate(&self, digits: u32, effort: &Effort) -> Result<PointOutcome, RouteFailure>;
}

/// What a route found.
#[derive(Clone, Debug)]
pub struct PointOutcome {
    /// Enclosure of the number.
    pub value: Complex,
    /// Working precision in bits.
    pub bits: Bits,
    /// Number of nodes or terms.
    pub nodes: usize,
    /// Named numbers that fix the computation.
    pub witness: Vec<(String, String)>,
}

/// Bits that hold `digits` decimal digits, and a few.
pub(super) fn bits_for(digits: u32) -> Bits {
    (f64::from(digits) * std::f64::consts::LOG2_10).ceil() as Bits + 16
}
