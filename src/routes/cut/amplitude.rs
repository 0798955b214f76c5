//! What the cut route has to know of a packet.

use crate::arithmetic::{Bits, Complex, Magnitude, Real};
use crate::routes::RouteFailure;
use rug::Rational;

/// A compact packet whose momentum amplitude on the branch cut is in closed form.
///
/// With the support ending at `x_R` on the right, all the route needs is
///
/// ```text
/// F(z) = Int psi0(x) exp(z (x - x_R)) dx,     Int |psi0|^2 dx = 1,
/// ```
///
/// which is `sqrt(2 pi) phi(i z) exp(-z x_R)`: entire, and bounded for `Re z >= 0`.
pub trait CutAmplitude: Send + Sync {
    /// Half of the length of the support, exactly.
    fn half_width(&self) -> Rational;

    /// `psi0(x / factor)` for `factor > 0`, normalised again.
    fn scaled(&self, factor: &Rational) -> Box<dyn CutAmplitude>;

    /// `psi0(-x)`.
    fn mirrored(&self) -> Box<dyn CutAmplitude>;

    /// Whether both sides outside the cone certainly have the same probability.
    fn is_symmetric(&self) -> bool;

    /// Whether `psi0` is certainly real, so that `F` is real on the real line.
    fn is_real(&self) -> bool;

    /// The tables for evaluations at one precision.
    ///
    /// # Errors
    /// [`RouteFailure::OutOfReach`] if the norm has no useful enclosure.
    fn prepare(&self, bits: Bits) -> Result<Box<dyn PreparedAmplitude>, RouteFailure>;
}

/// The amplitude `F`, ready for evaluations.
pub trait PreparedAmplitude: Send + Sync {
    /// `F(kappa)` for real `kappa >= 0`.
    fn value(&self, kappa: &Real) -> Complex;

    /// `V >= sup |z F(z)|` over `Re z >= 0`: the total variation of `psi0` on the whole line, as `z F(z) = -Int exp(z (x -
    /// x_R)) d psi0(x)`.
    fn variation(&self) -> Magnitude;

    /// A bound of `kappa' |F(kappa')|` over all real `kappa' >= kappa > 0`.
    fn tail(&self, kappa: &Real) -> Magnitude;
}
