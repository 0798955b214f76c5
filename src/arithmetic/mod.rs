//! Enclosure arithmetic: everything later rests on this module and on nothing else.
//!
//! # What an enclosure means here
//!
//! A [`Real`] is a pair (midpoint, radius) and stands for the set of all real numbers `x` with
//! `|x - midpoint| <= radius`. The *inclusion principle*, stated once and used everywhere: for
//! every function `f` offered on balls and every choice of points inside the argument balls, the
//! value of `f` at these points lies inside the ball returned. Nothing else is promised; in
//! particular the radius may be infinite, which says "nothing known", and it is never an error to
//! be too wide. Correctness is inclusion, quality is narrowness, and the tests check both.
//!
//! * [`magnitude`]: the radius, an unsigned 32-bit mantissa with a 64-bit exponent, rounded up.
//! * [`rounding`]: the only place where MPFR is called with a rounding direction.
//! * [`real`], [`complex`]: midpoint-radius balls.
//! * [`convolution`]: sums of products along diagonals by one big-integer product.
//! * [`interval`]: the directed lower/upper view used for input and output.
//! * [`exact`]: decimals, fractions and intervals read without any rounding.
//! * [`decimal`]: decimals printed with outward rounding, and the guaranteed-digits form.
//! * [`written`]: statements about decimals as they are written, decided exactly.

pub mod complex;
pub mod convolution;
pub mod decimal;
pub mod exact;
pub mod interval;
pub mod magnitude;
pub mod real;
pub mod rounding;
pub mod written;

pub use complex::Complex;
pub use exact::ExactInput;
pub use interval::Interval;
pub use magnitude::Magnitude;
pub use real::Real;

/// Working precision in bits of mantissa.
pub type Bits = u32;
