//! Panels, numbers of terms and precisions, chosen in double precision. Nothing here decides containment.
//!
//! An error `e` of `Q` on a region of length `L` changes `I = Int |Q|^2` by about `2 e sqrt(L I)` (Cauchy and
//! Schwarz), which fixes the accuracy wanted of `Q`. An error of `F` on a panel enters `Q` there and, through the
//! iterated integrals, everywhere nearer to the cone with the weight `sum |c_kj| s^j` at most: for `s` much larger
//! than the packet this is the cancellation between the knots, and it is paid for with bits.

use super::Side;
use super::profile::Profile;
use crate::routes::RouteFailure;
use crate::routes::estimate::{bisect, dyadic, proper_distance};
use crate::routes::kernel::edge::terms_for;
use crate::routes::kernel::plan::{Sizes, best_ratio};
use rug::Rational;
use std::f64::consts::{LN_2, LN_10, LOG2_E, PI};

/// More panels than this are refused.
const MAX_PANELS: usize = 2000;

/// A panel, `s` from `from` to `to`.
pub(super) struct Panel {
    pub from: Rational,
    pub to: Rational,
    /// Taylor terms of `F` for each knot; at the cone, the first number is that of the logarithmic series.
    pub terms: Vec<usize>,
    /// Fixed-point units are `2^-scale`.
    pub scale: u32,
    /// Whether `|Q|^2` is integrated here, or only the constants of integration are carried.
    pub squared: bool,
}

impl Panel {
    pub(super) fn centre(&self) -> Rational {
        Rational::from(&self.from + &self.to) / 2
    }

    pub(super) fn half_width(&self) -> Rational {
        Rational::from(&self.to - &self.from) / 2
    }
}

/// A panel farther away than the packet's own size, see [`super::far`].
pub(super) struct FarPanel {
    pub from: Rational,
    pub to: Rational,
    /// Taylor terms of the kernel.
    pub terms: usize,
    /// Number of moments.
    pub moments: usize,
    /// Fixed-point units of the kernel's series and of `Q` are `2^-scale`.
    pub scale: u32,
    /// The same for the moments.
    pub moment_scale: u32,
}

impl FarPanel {
    pub(super) fn centre(&self) -> Rational {
        Rational::from(&self.from + &self.to) / 2
    }

    pub(super) fn half_width(&self) -> Rational {
        Rational::from(&self.to - &self.from) / 2
    }
}

/// All choices for one side.
pub(super) struct Plan {
    /// The panel at the cone; its series are about `s = 0`, its region begins at `from`.
    pub cone: Option<Panel>,
    /// From the cone outward, treated knot by knot.
    pub panels: Vec<Panel>,
    /// For each knot, panels beyond these on which its constants are carried in from the point that the last knot
    /// reaches. Used when there are far panels; otherwise constants come from the far end.
    pub extensions: Vec<Vec<Panel>>,
    /// Beyond, treated by moments.
    pub far: Vec<FarPanel>,
    /// Fixed-point units of the moments before scaling.
    pub moment_scale: u32,
    /// Largest precision used.
    pub bits: u32,
}

struct Planner<'a> {
    profile: &'a Profile,
    sizes: Sizes,
    /// `ln 10^digits`.
    goal: f64,
    /// Logarithm of the integral wanted.
    integral: f64,
    depths: Vec<f64>,
}

impl Plan {
    pub(super) fn new(side: &Side, digits: u32) -> Result<Plan, RouteFailure> {
        let profile = Profile::new(&side.shape, &side.time, &side.distance)
            .ok_or_else(|| refused("the ratios of the inputs are outside 1e-60 to 1e60"))?;
        let goal = f64::from(digits) * LN_10;
        let depths = side.shape.knots.iter().map(|knot| knot.depth.to_f64()).collect();
        let sizes = Sizes { t: profile.t, a: 0.0, tolerance: 0.0 };
        let integral = profile.log_integral();
        let planner = Planner { profile: &profile, sizes, goal, integral, depths };
        let sigma = planner.cone_width();
        let away = profile.d >= 0.5 * sigma;
        let start = if away { side.distance.clone() } else { dyadic(sigma, 1) };
        let (panels, far) = planner.panels(&start)?;
        let extensions = match far.first() {
            Some(first) if !(away && panels.is_empty()) => planner.extensions(side, &first.from)?,
            _ => Vec::new(),
        };
        let cone = (!away).then(|| planner.cone(side.distance.clone(), start));
        let near = panels.iter().chain(&cone).chain(extensions.iter().flatten()).map(|panel| panel.scale);
        let widest = near.chain(far.iter().map(|panel| panel.scale)).max().unwrap_or(64);
        let moment_scale = far.iter().map(|panel| panel.moment_scale).max().unwrap_or(64);
        let moment_scale = moment_scale + 12 + (0.5 * profile.kappa * profile.width * LOG2_E) as u32;
        let bits = widest.max((goal / LN_2) as u32 + 40);
        Ok(Plan { cone, panels, extensions, far, moment_scale, bits })
    }

    /// End of the outermost panel that is treated knot by knot.
    pub(super) fn far_end(&self) -> Rational {
        self.panels.last().or(self.cone.as_ref()).map(|panel| panel.to.clone()).unwrap_or_default()
    }

    /// End of the region in which `|Q|^2` is integrated.
    pub(super) fn squared_end(&self) -> Rational {
        let near = self.panels.iter().rev().find(|panel| panel.squared).or(self.cone.as_ref()).map(|panel| &panel.to);
        self.far.last().map(|panel| &panel.to).or(near).cloned().unwrap_or_default()
    }

    /// Number of series coefficients in all.
    pub(super) fn terms(&self) -> usize {
        let near = self.panels.iter().chain(&self.cone).chain(self.extensions.iter().flatten());
        near.map(|panel| panel.terms.iter().sum::<usize>()).chain(self.far.iter().map(|panel| panel.terms)).sum()
    }
}

fn refused(reason: &str) -> RouteFailure {
    RouteFailure::OutOfReach { reason: reason.to_owned() }
}

impl Planner<'_> {
    /// Widest panel that a carrier wave allows: it moves coefficients up by `exp(kappa w)`.
    fn widest(&self) -> f64 {
        if self.profile.kappa == 0.0 { f64::INFINITY } else { 2.0 * (4.0 + self.goal / 16.0) / self.profile.kappa }
    }

    /// Width of the logarithmic panel: well inside all radii of convergence, and `r` moderate.
    fn cone_width(&self) -> f64 {
        let t = self.profile.t;
        let reach = 1.0 + self.goal / 24.0;
        (0.25 * self.profile.gap()).min(0.5 * t).min(reach * reach / (2.0 * t)).min(0.5 * self.widest())
    }

    /// Logarithm of the error of `Q` allowed up to `to`.
    fn tolerance(&self, to: f64) -> f64 {
        0.5 * self.integral - self.goal - 200f64.ln() - 0.5 * to.ln()
    }

    /// Logarithm of the error of `F` allowed on a panel that ends at `to` and has the half-width `half`.
    fn accuracy(&self, to: f64, half: f64) -> f64 {
        let waves = if self.profile.standing { 4.0 } else { 2.0 };
        let crowd = (8.0 * self.depths.len() as f64).ln();
        self.tolerance(to)
            - self.profile.log_weight(to).max(self.profile.log_weight(half))
            - crowd
            - waves * self.profile.kappa * half
    }

    /// Whether nothing more is needed beyond `s`, for the integral and for the constants.
    fn finished(&self, s: f64) -> (bool, bool) {
        let r = self.sizes.separation(s);
        let v = self.profile.t + s;
        let tail = (self.profile.width * PI / (4.0 * v)).ln() - 2.0 * r.ln() - 2.0 * r + (1.0 / r).min(50.0);
        let constant = self.sizes.log_function(s) + self.profile.log_weight(1.0 + s);
        (tail < self.integral - self.goal - 100f64.ln(), constant < self.tolerance(s) - 1.0)
    }

    /// From here on moments are cheaper: nearer for a carrier wave, which makes panels short.
    fn far_start(&self) -> f64 {
        let width = self.profile.width;
        if self.profile.kappa > 0.0 {
            return width;
        }
        // At s the moments are about (goal + 10)/ln(s/a) in number; the work on knots grows with their functions.
        let most = 16.0 + 6.0 * self.profile.functions();
        (2.0 * width).max(0.5 * width * ((self.goal + 10.0) / most).min(300.0).exp())
    }

    /// Growing panels from `start` until the rest is negligible: those treated knot by knot, and those treated by
    /// moments.
    fn panels(&self, start: &Rational) -> Result<(Vec<Panel>, Vec<FarPanel>), RouteFailure> {
        let origin = proper_distance(self.profile.t, self.profile.d);
        let (mut near, mut far): (Vec<Panel>, Vec<FarPanel>) = (Vec::new(), Vec::new());
        let mut from = start.clone();
        loop {
            let s = from.to_f64();
            let (tail, constants) = self.finished(s);
            let none = near.is_empty() && far.is_empty();
            if tail && !none && (constants || !far.is_empty()) {
                return Ok((near, far));
            }
            if near.len() + far.len() >= MAX_PANELS {
                return Err(refused("the kernel route would need too many panels"));
            }
            let r = self.sizes.separation(s);
            let stride = (self.goal / 5.0).max(16.0) + (r - origin).max(0.0) * 0.25;
            let by_moments = !far.is_empty() || (s >= self.far_start() && (none || !tail));
            let widest = if by_moments { f64::INFINITY } else { self.widest() };
            let to = self.advance(&from, (s, 2.0 * s), stride, widest)?;
            if by_moments {
                far.push(self.far_panel(from, to.clone()));
            } else {
                near.push(self.panel(from, to.clone(), none || !tail));
            }
            from = to;
        }
    }

    /// The end of a panel from `from`: at most at `last` (given with the point itself in double precision), at most
    /// `stride` in `r` and `widest` in length.
    fn advance(
        &self,
        from: &Rational,
        (s, last): (f64, f64),
        stride: f64,
        widest: f64,
    ) -> Result<Rational, RouteFailure> {
        let r = self.sizes.separation(s);
        let far = bisect(s, last, |x| self.sizes.separation(x) - r > stride).min(s + widest);
        let to = if far >= 1.99 * s { Rational::from(from * 2) } else { dyadic(far, 12).max(dyadic(s * 1.001, 40)) };
        if to <= *from {
            return Err(refused("the panels of the kernel route do not advance"));
        }
        Ok(to)
    }

    /// Panels that carry the constants of each knot from the point `t + start + 2a` to `start`.
    fn extensions(&self, side: &Side, start: &Rational) -> Result<Vec<Vec<Panel>>, RouteFailure> {
        let width = Rational::from(&side.shape.half_width * 2);
        let mut all = Vec::with_capacity(side.shape.knots.len());
        for (index, knot) in side.shape.knots.iter().enumerate() {
            let end = start + Rational::from(&width - &knot.depth);
            let mut list = Vec::new();
            let mut from = start.clone();
            while from < end {
                if list.len() >= MAX_PANELS {
                    return Err(refused("the kernel route would need too many panels"));
                }
                let v = Rational::from(&from + &knot.depth);
                let stride = (self.goal / 5.0).max(16.0);
                let to = self.advance(&v, (v.to_f64(), 2.0 * v.to_f64()), stride, self.widest())? - &knot.depth;
                let to = to.min(end.clone());
                let mut panel = self.panel(from, to.clone(), false);
                panel.terms = panel.terms.get(index).copied().into_iter().collect();
                list.push(panel);
                from = to;
            }
            all.push(list);
        }
        Ok(all)
    }

    /// Logarithm of the kernel `K_1(r)/r` at `v = t + s`.
    fn log_kernel(&self, s: f64) -> f64 {
        let r = self.sizes.separation(s);
        0.5 * (1.0 + 0.5 * PI * r).ln() - r - 2.0 * r.ln()
    }

    fn far_panel(&self, from: Rational, to: Rational) -> FarPanel {
        let (low, high) = (from.to_f64(), to.to_f64());
        let (half, a) = (0.5 * (high - low), 0.5 * self.profile.width);
        let (centre, reach) = (0.5 * (low + high) + a, half + a);
        let wanted = self.tolerance(high) - 4f64.ln();
        let length = 0.5 * self.profile.width.ln();
        // The series of W g, with the weight Int |psi0| / W.
        let accuracy = wanted - length + reach.ln();
        let cost = |ratio: f64| {
            let left = self.log_kernel(centre - ratio * reach) + reach.ln() - (1.0 - 1.0 / ratio).ln();
            ((left + 1.0 - accuracy) / ratio.ln()).max(1.0)
        };
        let terms = cost(best_ratio(centre / reach, cost)).ceil().min(1e9) as usize + 1;
        let bits = |accuracy: f64| (-accuracy / LN_2).max(0.0);
        let scale = bits(accuracy - self.sizes.growth(centre, reach)) + (terms as f64).log2() + 7.0;
        // Sum |G_n| (1 + alpha)^n = W g(v_c - W - w), as the signs of G_n alternate.
        let unit = wanted - reach.ln() - self.log_kernel(centre - reach - half);
        let size = length - a.ln();
        let moments = ((size - unit) / (reach / a).ln()).ceil().max(1.0) as usize;
        FarPanel {
            from,
            to,
            terms,
            moments: moments.min(terms),
            scale: scale.max(32.0) as u32,
            moment_scale: bits(unit) as u32 + 4,
        }
    }

    fn panel(&self, from: Rational, to: Rational, squared: bool) -> Panel {
        let (low, high) = (from.to_f64(), to.to_f64());
        let (centre, half) = (0.5 * (low + high), 0.5 * (high - low));
        let accuracy = self.accuracy(high, half);
        let centres = self.depths.iter().map(|depth| centre + depth);
        let terms: Vec<usize> = centres.clone().map(|c| self.sizes.terms(c, half, accuracy - 2.0)).collect();
        let scale = self.scale(accuracy, half, centres.zip(&terms));
        Panel { from, to, terms, scale, squared }
    }

    /// Bits for errors below `exp(accuracy)`, for series about each of the centres.
    fn scale<'t>(&self, accuracy: f64, half: f64, series: impl Iterator<Item = (f64, &'t usize)>) -> u32 {
        let growth = |(centre, terms): (f64, &usize)| self.sizes.growth(centre, half) / LN_2 + (*terms as f64).log2();
        let most = series.map(growth).fold(0.0, f64::max);
        let waves = self.profile.kappa * half * LOG2_E;
        (most + waves - accuracy / LN_2 + 7.0).max(32.0) as u32
    }

    fn cone(&self, from: Rational, to: Rational) -> Panel {
        let sigma = to.to_f64();
        let accuracy = self.accuracy(sigma, sigma);
        let scaled = accuracy + (2.0 * self.profile.t).ln();
        let first = terms_for(self.profile.t, sigma, scaled - 3.0);
        let others = self.depths.iter().skip(1);
        let mut terms: Vec<usize> =
            others.clone().map(|depth| self.sizes.terms(*depth, sigma, accuracy - 2.0)).collect();
        let plain = self.scale(accuracy, sigma, others.copied().zip(&terms));
        let growth = self.sizes.separation(sigma);
        let logarithmic = (1.5 * growth - scaled) / LN_2 + 2.0 * (first as f64).log2() + 8.0;
        terms.insert(0, first);
        Panel { from, to, terms, scale: plain.max(logarithmic.max(48.0) as u32), squared: true }
    }
}
