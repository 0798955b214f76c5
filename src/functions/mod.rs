//! Elementary and special functions of balls.

pub mod bessel_k;
pub mod complex_elementary;
pub(crate) mod constants;
pub mod dilogarithm;
pub mod elementary;
pub mod erfc;
