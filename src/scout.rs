//! A quick look in double precision, **not certified**.
//!
//! The amplitude at the distance `s` beyond the region's edge, `x = R + s`, is summed on the branch
//! cut by the trapezoid rule in the rapidity `eta`, and its square is integrated over `ln s` by the
//! double-exponential rule. In the scaled units of [`TailProblem`], with `D = d + s` the distance
//! from the light cone and `kappa = cosh eta`, `q = sinh eta`,
//!
//! ```text
//! psi = (2 i / sqrt(2 pi)) Int d eta (d kappa / d eta) sinh(q t) phi(i kappa) exp(-kappa (a + t + D)),
//! P(|x| > R) = 2 Int_0^inf |psi|^2 ds.
//! ```
//!
//! The exponents that remain after the exact cancellation of `kappa (a + t)` add up to at least
//! `E = sqrt(D (D + 2 t))`, reached at `eta_0 = ln(1 + 2 t / D) / 2`:
//! `t exp(-eta) + D cosh eta = E cosh(eta - eta_0)`. So `exp(-E)` is taken out of every amplitude and its
//! value at the edge is kept as a logarithm: a tail of 1e-100000 is estimated like any other. Without
//! mass the sum is a logarithm in closed form.
//!
//! Nothing here bounds an error, and nothing certified rests on it.

use crate::arithmetic::ExactInput;
use crate::error::Error;
use crate::quantities::tail::{Side, TailRequest, scale};
use crate::routes::TailProblem;
use num_complex::Complex64;
use quadrature::double_exponential;
use rug::Rational;
use std::f64::consts::{LN_10, PI, TAU};
use std::time::Instant;

/// Exponents beyond which a factor is dropped: `exp(-42)` is below double precision.
const NEGLIGIBLE: f64 = 42.0;
/// Longest piece of `ln s` given to one double-exponential rule.
const PIECE: f64 = 8.0;

/// An estimate without any guarantee.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Scout {
    log10: Option<f64>,
    /// Time taken.
    pub seconds: f64,
}

impl Scout {
    /// The decimal logarithm of the estimate; `None` stands for a probability of zero.
    pub fn log10(&self) -> Option<f64> {
        self.log10
    }

    /// The estimate with six digits, of which the last ones may be wrong.
    pub fn decimal(&self) -> String {
        let Some(log10) = self.log10 else {
            return "0".to_owned();
        };
        let exponent = log10.floor();
        let mantissa = 10f64.powf(log10 - exponent);
        if (-5.0..1.0).contains(&exponent) {
            // Six significant digits behind the zeros.
            return format!("{:.*}", (5.0 - exponent) as usize, mantissa * 10f64.powf(exponent));
        }
        let text = format!("{mantissa:.5}");
        if text.starts_with("10") { format!("1.00000e{}", exponent + 1.0) } else { format!("{text}e{exponent}") }
    }
}

/// Estimates the answer to a request.
///
/// ```
/// use coneproof::{packets::BoxPacket, quantities::tail::TailRequest, scout};
/// let packet = BoxPacket::new("1".parse()?)?;
/// let scout = scout::estimate(&TailRequest::new(packet, "1".parse()?, "1".parse()?)?)?;
/// assert!(scout.decimal().starts_with("0.02137"));
/// # Ok::<(), Box<dyn std::error::Error>>(())
/// ```
///
/// # Errors
/// [`Error::BadInput`] for a request that cannot be used, an input that is an interval, or numbers
/// outside the range of double precision.
pub fn estimate(request: &TailRequest) -> Result<Scout, Error> {
    request.validate()?;
    let start = Instant::now();
    let half_width = point("half-width", request.packet.half_width())?;
    let mass = point("mass", &request.mass)?;
    let time = point("time", &request.time)?;
    let beyond = request.beyond.as_ref().map(|region| point("beyond", region)).transpose()?;
    let both = match scale(half_width, mass, time, beyond) {
        None => None,
        Some(problem) => Some(two_sided_log10(&Doubles::new(&problem)?)),
    };
    let share = if request.side == Side::Both { 0.0 } else { 0.5f64.log10() };
    Ok(Scout { log10: both.map(|log10| log10 + share), seconds: start.elapsed().as_secs_f64() })
}

fn point<'a>(field: &str, input: &'a ExactInput) -> Result<&'a Rational, Error> {
    if input.is_point() {
        return Ok(input.lower());
    }
    Err(Error::bad_input(field, input.text(), "a scout takes single numbers only, not intervals"))
}

/// A problem in double precision.
struct Doubles {
    half_width: f64,
    time: f64,
    distance: f64,
    massless: bool,
}

impl Doubles {
    fn new(problem: &TailProblem) -> Result<Doubles, Error> {
        let in_range = |value: f64| (1e-60..1e60).contains(&value);
        let doubles = Doubles {
            half_width: problem.half_width.to_f64(),
            time: problem.time.to_f64(),
            distance: problem.distance.to_f64(),
            massless: problem.massless,
        };
        let at_cone = problem.distance == 0;
        if in_range(doubles.half_width) && in_range(doubles.time) && (at_cone || in_range(doubles.distance)) {
            return Ok(doubles);
        }
        let (a, t, d) = (doubles.half_width, doubles.time, doubles.distance);
        let was = format!("ratios m a = {a:.1e}, m t = {t:.1e}, m (R - a - t) = {d:.1e}");
        let wanted =
            "a scout needs them between 1e-60 and 1e60 (lengths in units of a for mass 0): ask without --scout";
        Err(Error::bad_input("scout", was, wanted))
    }

    /// `phi(i kappa) exp(-kappa a)` of the box; complex, as a moving packet's would be.
    fn amplitude_on_cut(&self, kappa: f64) -> Complex64 {
        let scaled_sinh = -(-2.0 * kappa * self.half_width).exp_m1() / 2.0;
        Complex64::from(scaled_sinh / (kappa * (PI * self.half_width).sqrt()))
    }

    /// `E`, the exponent taken out of the amplitude at the distance `D` from the cone.
    fn exponent(&self, from_cone: f64) -> f64 {
        if self.massless { 0.0 } else { (from_cone * (from_cone + 2.0 * self.time)).sqrt() }
    }

    /// `psi exp(E)` at the distance `D > 0` from the cone.
    fn amplitude(&self, from_cone: f64) -> Complex64 {
        let integral = if self.massless { self.massless_integral(from_cone) } else { self.cut_integral(from_cone) };
        Complex64::new(0.0, 2.0 / TAU.sqrt()) * integral
    }

    /// Over the cut from 0: `Int (1 - e^(-2 t k)) (1 - e^(-2 a k)) e^(-D k) dk / k` is a logarithm.
    fn massless_integral(&self, from_cone: f64) -> Complex64 {
        let (a, t) = (self.half_width, self.time);
        let logarithm = (4.0 * a * t / (from_cone * (from_cone + 2.0 * a + 2.0 * t))).ln_1p();
        Complex64::from(logarithm / 4.0 / (PI * a).sqrt())
    }

    fn cut_integral(&self, from_cone: f64) -> Complex64 {
        let exponent = self.exponent(from_cone);
        let centre = (2.0 * self.time / from_cone).ln_1p() / 2.0;
        let reach = (1.0 + NEGLIGIBLE / exponent).acosh();
        let step = f64::min(0.25, 0.7 / exponent.sqrt());
        let first = ((centre - reach) / step).floor().max(1.0) as u64;
        let last = ((centre + reach) / step).ceil() as u64;
        let term = |index: u64| {
            let eta = index as f64 * step;
            let half_gap = ((eta - centre) / 2.0).sinh();
            let decay = (-2.0 * exponent * half_gap * half_gap).exp();
            let evolved = -(-2.0 * self.time * eta.sinh()).exp_m1() / 2.0;
            self.amplitude_on_cut(eta.cosh()) * (eta.sinh() * evolved * decay)
        };
        (first..=last).map(term).sum::<Complex64>() * step
    }

    /// The density at `R + s`, without the factor `exp(-2 E)` of the region's edge.
    fn density(&self, s: f64) -> f64 {
        let squared = self.amplitude(self.distance + s).norm_sqr();
        if self.massless {
            return squared;
        }
        let edge = self.exponent(self.distance);
        let here = self.exponent(self.distance + s);
        let growth = s * (2.0 * self.distance + s + 2.0 * self.time) / (here + edge);
        squared * (-2.0 * growth).exp()
    }

    /// The largest `s` that matters.
    fn farthest(&self) -> f64 {
        let (t, d) = (self.time, self.distance);
        if self.massless {
            return 1e6 * (self.half_width + t + d);
        }
        // From E(s) = E(0) + NEGLIGIBLE / 2.
        let rise = NEGLIGIBLE / 2.0 * (2.0 * self.exponent(d) + NEGLIGIBLE / 2.0);
        rise / (d + t + ((d + t).powi(2) + rise).sqrt())
    }
}

/// The decimal logarithm of `P(|x| > R)`.
fn two_sided_log10(problem: &Doubles) -> f64 {
    let farthest = problem.farthest();
    let nearest = 1e-16 * farthest.min(problem.half_width).min(problem.time);
    let (low, high) = (nearest.ln(), farthest.ln());
    let integrand = |u: f64| problem.density(u.exp()) * u.exp();
    let sample = |k: u32| integrand(low + (high - low) * f64::from(k) / 64.0);
    let tallest = (0..=64).map(sample).fold(0.0, f64::max);
    let pieces = ((high - low) / PIECE).ceil().max(1.0);
    let width = (high - low) / pieces;
    let one_side: f64 = (0..pieces as u32)
        .map(|k| low + width * f64::from(k))
        .map(|from| double_exponential::integrate(integrand, from, from + width, 1e-10 * tallest).integral)
        .sum();
    (2.0 * one_side).log10() - 2.0 * problem.exponent(problem.distance) / LN_10
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::packets::BoxPacket;

    fn estimated(half_width: &str, mass: &str, time: &str, beyond: Option<&str>) -> f64 {
        let packet = BoxPacket::new(half_width.parse().unwrap()).unwrap();
        let mut request = TailRequest::new(packet, mass.parse().unwrap(), time.parse().unwrap()).unwrap();
        request.beyond = beyond.map(|text| text.parse().unwrap());
        estimate(&request).unwrap().log10().unwrap()
    }

    #[test]
    fn agrees_with_values_from_the_definition() {
        // Sources: references/box_tail_from_definition.json.
        let cases = [
            ("1", "1", "1", None, 0.021_375_190_842_329_46),
            ("1", "1", "1", Some("12"), 1.085_950_197_488_84e-14),
            ("1", "1", "1", Some("20"), 2.4987e-22),
            ("0.1", "1", "1", None, 0.0943074606714377),
            ("0.1", "1", "100", None, 0.005050638261886189),
            ("5", "1", "5", None, 0.0018388831197988732),
        ];
        for (a, m, t, beyond, value) in cases {
            let found = 10f64.powf(estimated(a, m, t, beyond));
            let tolerance = if beyond.is_some() { 1e-4 } else { 1e-9 };
            assert!((found / value - 1.0).abs() < tolerance, "{a} {m} {t} {beyond:?}: {found} instead of {value}");
        }
    }

    #[test]
    fn tends_to_one_sixth_without_mass() {
        assert!((10f64.powf(estimated("1", "0", "1e9", None)) * 6.0 - 1.0).abs() < 1e-6);
    }

    #[test]
    fn scales_and_survives_the_corners() {
        for (a, t) in [("1e-9", "1e-18"), ("1e-9", "1"), ("1e9", "1e18"), ("1e9", "1")] {
            let log10 = estimated(a, "1", t, None);
            assert!(log10.is_finite() && log10 < 0.0, "{a} {t}: {log10}");
        }
        let (one, other) = (estimated("1", "1", "1", None), estimated("2", "1/2", "-2", None));
        assert!((one - other).abs() < 1e-12);
        let tiny = estimated("1", "1", "1", Some("115133"));
        assert!((-100_020.0..-99_990.0).contains(&tiny), "{tiny}");
    }

    #[test]
    fn decimals_of_every_size() {
        let show = |log10: f64| Scout { log10: Some(log10), seconds: 0.0 }.decimal();
        assert_eq!(show(0.021_375_190_842_329_46_f64.log10()), "0.0213752");
        assert_eq!(show(-100_000.0), "1.00000e-100000");
        assert_eq!(show(1.0862e-14f64.log10()), "1.08620e-14");
        assert_eq!(Scout { log10: None, seconds: 0.0 }.decimal(), "0");
    }
}
