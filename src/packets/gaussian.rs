//! The gaussian: smooth, not compact, possibly moving.

use crate::arithmetic::ExactInput;
use crate::error::Error;
use rug::Rational;

/// `psi0(x) = (2 pi s^2)^(-1/4) exp(-x^2/(4 s^2) + i k x)`: norm one, centred at zero, `s` the standard deviation of
/// `|psi0|^2` and `k` the mean momentum.
///
/// Its momentum amplitude is `phi(p) = (2 s^2/pi)^(1/4) exp(-s^2 (p - k)^2)`; the standard deviation of the momentum is
/// `1/(2 s)` (with `hbar = 1`).
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct GaussianPacket {
    sigma: ExactInput,
    momentum: ExactInput,
}

impl GaussianPacket {
    /// The packet's name on the command line and in certificates.
    pub const NAME: &'static str = "gaussian";

    /// A gaussian at rest with standard deviation `sigma > 0`.
    ///
    /// # Errors
    /// [`Error::BadInput`] if `sigma` is not certainly positive.
    pub fn new(sigma: ExactInput) -> Result<GaussianPacket, Error> {
        if *sigma.lower() <= 0 {
            let wanted = "give a standard deviation of |psi0|^2 greater than 0, such as 1, 0.5 or 1/3";
            return Err(Error::bad_input("sigma", sigma.text(), wanted));
        }
        Ok(GaussianPacket { sigma, momentum: ExactInput::from_rational(Rational::new()) })
    }

    /// The same packet with mean momentum `momentum`, of either sign.
    pub fn with_momentum(mut self, momentum: ExactInput) -> GaussianPacket {
        self.momentum = momentum;
        self
    }

    /// The standard deviation of `|psi0|^2`.
    pub fn sigma(&self) -> &ExactInput {
        &self.sigma
    }

    /// The mean momentum.
    pub fn momentum(&self) -> &ExactInput {
        &self.momentum
    }
}
