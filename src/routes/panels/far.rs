//! `Q` on panels farther away than the packet's own size: one Taylor series of the kernel and the packet's moments.
//!
//! With `z` the distance to the left of the packet's middle, `Q(s) = Int g(t + s + a + z) psi0 dz`, up to a phase.
//! Let the panel be `s = s_c + w x`, and `g = (1/W) Sum_n G_n ((v - v_c)/W)^n` about `v_c = t + s_c + a` with
//! `W = w + a`. As `v - v_c = w x + z`, by the binomial theorem
//!
//! ```text
//! Q = Sum_m alpha^m x^m Sum_k C(m+k, k) G_(m+k) nu_k,    alpha = w/W,    nu_k = M_k/W^(k+1) = (a/W)^(k+1) M~_k.
//! ```
//!
//! No constant of integration is needed, and nothing cancels but what cancels in the moments themselves.
//!
//! **Error.** `|w x + z| <= W`, so an error `e` of the series of `W g` (sum over coefficients, truncation included)
//! changes `Q` by at most `e Int |psi0| / W`. An error `epsilon` of every component of every `nu_k`, including those
//! set to zero, changes it by at most
//! `epsilon Sum_n |G_n| Sum_k C(n, k) alpha^(n-k) = epsilon Sum_n |G_n| (1 + alpha)^n`. The powers `alpha^m` in fixed
//! point are off by at most `m` of their units, and the products are cut once.

use super::Side;
use super::expansion::{ComplexList, Expansion, size};
use super::moments::Moments;
use super::plan::FarPanel;
use crate::arithmetic::{Magnitude, Real};
use crate::routes::kernel::BOUND_BITS;
use crate::routes::kernel::panel::{fixed, kernel_series};
use crate::routes::{Effort, RouteFailure};
use rug::{Float, Integer, Rational};

/// `Q` on the panel, in units of `2^-scale` of the panel.
pub(super) fn on_panel(
    side: &Side,
    panel: &FarPanel,
    moments: &Moments,
    effort: &Effort,
) -> Result<Expansion, RouteFailure> {
    let a = &side.shape.half_width;
    let half = panel.half_width();
    let reach = Rational::from(&half + a);
    let centre = panel.centre() + a;
    let place = (&side.time, &centre, &reach);
    let (kernel, kernel_error) = kernel_series(place, panel.scale, panel.terms, super::bounds::kernel_bound, effort)?;
    let scaled = ScaledMoments::new(moments, &Rational::from(a / &reach), panel)?;
    let sums = correlation(&kernel, &scaled.list, effort)?;
    let alpha = half / &reach;
    let upper = |value: &Rational| Real::from_rational(value, BOUND_BITS).abs_upper();
    // Int |psi0| = a times the bound of the moments.
    let through_kernel = kernel_error.mul(moments.size).mul(upper(&Rational::from(a / &reach)));
    let through_moments = scaled.error.mul(grown_sum(&kernel, upper(&alpha), panel.scale));
    let (regular, rounding) = with_powers(sums, &alpha, panel);
    let error = through_kernel.add(through_moments).add(rounding);
    Ok(Expansion { regular, logarithm: ComplexList::default(), error })
}

/// `nu_k` in units of `2^-moment_scale`.
struct ScaledMoments {
    list: ComplexList,
    /// Bound of the error of each component of each, the ones left out included.
    error: Magnitude,
}

impl ScaledMoments {
    fn new(moments: &Moments, beta: &Rational, panel: &FarPanel) -> Result<ScaledMoments, RouteFailure> {
        let scale = panel.moment_scale;
        let bits = scale + 32;
        let beta = Real::from_rational(beta, bits);
        let unit = Magnitude::power_of_two(-i64::from(scale));
        let mut power = beta.clone();
        let mut list = ComplexList::default();
        let mut error = Magnitude::ZERO;
        for k in 0..panel.moments {
            for (source, target) in [(&moments.list.re, &mut list.re), (&moments.list.im, &mut list.im)] {
                if let Some(value) = source.get(k) {
                    let ball = Real::from_scaled(value, -i64::from(moments.scale)).widen(moments.error);
                    let (value, radius) = fixed(&ball.mul(&power, bits), scale)?;
                    target.push(value);
                    error = error.max(radius.mul(unit));
                }
            }
            power = power.mul(&beta, bits);
        }
        // All others are smaller than the first of them can be.
        Ok(ScaledMoments { list, error: error.max(power.abs_upper().mul(moments.size)) })
    }
}

/// `Sum_k C(m+k, k) kernel_(m+k) moments_k` for each `m`.
fn correlation(kernel: &[Integer], moments: &ComplexList, effort: &Effort) -> Result<ComplexList, RouteFailure> {
    let count = moments.re.len().max(moments.im.len());
    let zeros = |used: bool| if used { vec![Integer::new(); kernel.len()] } else { Vec::new() };
    let mut sums = ComplexList { re: zeros(!moments.re.is_empty()), im: zeros(!moments.im.is_empty()) };
    for (n, value) in kernel.iter().enumerate() {
        if n % 64 == 0 {
            effort.check()?;
        }
        let mut product = value.clone();
        for k in 0..count.min(n + 1) {
            for (target, source) in [(&mut sums.re, &moments.re), (&mut sums.im, &moments.im)] {
                if let (Some(entry), Some(moment)) = (target.get_mut(n - k), source.get(k))
                    && *moment != 0
                {
                    *entry += &product * moment;
                }
            }
            // C(n, k+1) = C(n, k) (n - k)/(k + 1), without remainder.
            product *= (n - k) as u64;
            product.div_exact_u_mut((k + 1) as u32);
        }
    }
    Ok(sums)
}

/// `Sum |G_n| (1 + alpha)^n`.
fn grown_sum(kernel: &[Integer], alpha: Magnitude, scale: u32) -> Magnitude {
    let ratio = Magnitude::ONE.add(alpha);
    let mut power = Magnitude::ONE;
    let mut total = Magnitude::ZERO;
    for value in kernel {
        let size = Magnitude::from_float(&Float::with_val_round(64, value, rug::float::Round::AwayZero).0);
        total = total.add(size.mul(power));
        power = power.mul(ratio);
    }
    total.shift(-i64::from(scale))
}

/// The sums times `alpha^m`, in units of the panel, and the bound of the sum of the roundings.
fn with_powers(mut sums: ComplexList, alpha: &Rational, panel: &FarPanel) -> (ComplexList, Magnitude) {
    let digits = sums.bits().saturating_sub(panel.moment_scale) + 24;
    let count = Magnitude::from_u64(sums.len() as u64);
    let spread = size(&sums.re).add(size(&sums.im)).mul(count);
    let drop = panel.moment_scale + digits;
    for list in [&mut sums.re, &mut sums.im] {
        let mut power = Integer::from(1) << digits;
        for value in list.iter_mut() {
            *value *= &power;
            *value >>= drop;
            power *= alpha.numer();
            power /= alpha.denom();
        }
    }
    let rounding = count.add(spread.shift(-i64::from(drop))).shift(-i64::from(panel.scale));
    (sums, rounding)
}
