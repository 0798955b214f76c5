//! Placeholder.
use super::{Effort, Route, RouteFailure, RouteOutcome, TailProblem};

/// The route.
pub struct Kernel;

/// The route.
pub const KERNEL: Kernel = Kernel;

impl Route for Kernel {
    fn name(&self) -> &'static str {
        "kernel"
    }

    fn method(&self) -> &'static str {
        "placeholder"
    }

    fn evaluate(&self, _: &TailProblem, _: u32, _: &Effort) -> Result<RouteOutcome, RouteFailure> {
        Err(RouteFailure::OutOfReach { reason: "not here yet".to_owned() })
    }
}
