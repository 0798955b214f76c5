//! Everything that separates the two lattice sums from the integrals, in units of `exp(-2E)`.
//!
//! Notation as in [`super`]; `b < pi/2` is the half-width of the strip, `S = e^(|theta|/2)`, `C = q cosh w`.
//!
//! **Lemma 1 (where `sigma` goes).** For `|Im w| <= b` and for `|Im z| <= b`: `|Im sigma| <= b`. *Proof.*
//! `cosh(u + iv) = cosh u cos v + i sinh u sin v` has an argument of at most `b`; so has `C`, and so has `cosh
//! sigma = sqrt(1 + C^2)`, half of the argument of a number between those of `1` and `C^2`; so has the sum
//! `e^sigma`. For the other map, `tanh` takes the strip to the lens between two circular arcs through `±1` that
//! meet the imaginary axis at `±i tan b`; for `b <= pi/4` it is convex, else the union of two discs that contain
//! zero, so with a point it contains `T < 1` times the point. ∎
//!
//! So `k`, `l` have `Re k >= cos b cosh(Re sigma - theta/2)` and so on, and since `Re(r1^2 e^s + r2^2 e^-s) >=
//! cos b (r1^2 e^(Re s) + r2^2 e^(-Re s)) >= E cos b`, both exponentials are at most `exp(-E cos b)`; with
//! `exp(-E)` taken out they count as `exp(E (1 - cos b))`.
//!
//! **Lemma 2.** If `|arg W| <= 2b` then `|1 + W| >= cos b (1 + |W|)`. *Proof.* `|1+W|^2 = (1+r)^2 - 2r(1 - cos
//! f) >= (1+r)^2 (1 - (1 - cos f)/2) = (1+r)^2 cos^2(f/2)`. ∎
//!
//! **Lemma 3 (densities of `A`).** With `t(u) = q^2 cosh^2 u/(1 + q^2 cosh^2 u) <= 1`: on the real line `f1, f2
//! <= S t`; on the strip `|f1|, |f2| <= 2 S cos^-4 b exp(E (1 - cos b)) t(Re w)`. *Proof.* On the strip `|cosh
//! sigma|^2 = |1 + C^2| >= cos b (1 + |C|^2)` and `|C| >= q cosh u cos b`, so `|rho/cosh sigma| <= q^2 cosh^2
//! u/(cos b (1 + q^2 cosh^2 u cos^2 b)) <= t/cos^3 b`. `|l| >= cos b cosh(Re sigma + theta/2) >= cos b cosh(Re
//! sigma)/S >= cos b |cosh sigma|/S`, the same for `k`, and `|1 - exp(-2al)| <= 2`. On the real line all cosines
//! and the factor two are one. ∎
//!
//! **Lemma 4 (denominators).** For positions `K` on the strip and `K'` on the line, `|K + K'| >= (cosh u + cosh
//! w') q cos^(3/2) b/(2S)`; if both are on the line, `K + K' >= (cosh w + cosh w') q/S`. *Proof.* Lemma A of
//! [`crate::routes::spectral`]: `|K + K'| >= (cosh Re(sigma ∓ theta/2) + K')/2`, and `cosh Re(sigma ∓ theta/2)
//! >= |cosh sigma|/S >= sqrt(cos b) q cosh u cos b/S`. ∎
//!
//! **Theorem 5 (`A`).** `|I_A - S_A| <= 16 pi^2 S^3 exp(E(1 - cos b))/(q cos^(11/2) b (e^(2 pi b/h) - 1))`.
//! *Proof.* `4 I_A` is the integral over the whole plane, `4 S_A` its lattice sum (the axes give zero). The
//! trapezoid rule errs by at most `2M/(e^(2 pi b/h) - 1)` if `M` bounds the integrals of the absolute value on
//! the edges of the strip (Trefethen and Weideman, SIAM Review 56 (2014), theorem 5.1). For one of the four
//! pairs of densities, with `D = 2S/(q cos^(3/2) b)`, `G` the bound on the strip and `S` that on the line: in
//! `w` at fixed `w' = lh`, `M <= G D Int du/(cosh u + cosh w') = 2 G D w'/sinh w'`, and `h Sum_l S 2 w'/sinh w'
//! <= S pi^2` over all `l != 0` as `w/sinh w` falls on the right half line, where its integral is `pi^2/4`; then
//! in `w'` for the integral over `w`, `M <= G D S Int Int du dw/(cosh u + cosh w) = G D S pi^2`. Together `4
//! pi^2 G D S/(e - 1)` for each pair; a quarter of four of them. ∎
//!
//! **Theorem 6 (`B`).** `|I_B - S_B| <= 2 pi (pi + h) q^4 c^4 exp(E(1 - cos b))/(cos^(11/2) b (e^(2 pi b/h) -
//! 1))`. *Proof.* By Lemma 2 with `W = cosh^2 z/q^2`, `|c^2 + sinh^2 z| = |q^2 + cosh^2 z| >= cos b (q^2 + cos^2
//! b cosh^2 u) >= cos^3 b cosh^2 u`; `|l| >= cos b`; so the density is at most `2 q^2 c^2 cos^(-11/2) b
//! exp(E(1 - cos b)) sech^3 u` on the strip, and `q^2 c^2 sech^3 u` on the line. `Int sech^3 = pi/2`, its lattice
//! sum is at most `pi/2 + h` (unimodal, maximum one), and `1/|K + K'| <= 1` on the strip by Lemma A. The two steps give
//! `2 pi (pi/2 + h)` and `pi^2` times `q^4 c^4 cos^(-11/2) b ...`. ∎
//!
//! # Where the sums end
//!
//! * `A` on the right, at `X`: pairs with a node beyond add at most `8 S^3/q * 2 (X+1) e^-X/(1 - e^(-2X)) *
//!   exp(-Y)`: each of the four products is at most `S^2`, `h Sum_l 1/(cosh w + cosh lh) <= w/sinh w`,
//!   `Int_X^inf w/sinh w dw <= 2 (X+1) e^-X/(1 - e^(-2X))`; `Y` is the smaller exponent at the first node left
//!   out, provided that `Y1` rises there (`Y2` rises everywhere, as `r2 >= r1` and `y >= 0`).
//! * `A` on the left: at most `8 S^3/q * pi^2/4 * exp(-Y)`, `Y` the smaller of `Y1` at the last node left out,
//!   provided that it falls there, and of `Y2` at `w = 0`.
//! * `B`: nodes beyond `Z` on one side add at most `q^4 c^4 (8/3) e^(-3Z) (pi/2 + h)` as `K + K' >= 2` and
//!   `sech^3 z <= 8 e^(-3z)`; on the left also times `exp(-Y1)` at the last node left out, provided that it
//!   falls there, and with `pi/2 + h` for the exponential if `Z <= 0`.

use super::Setting;
use super::nodes::{inner_gap, outer_exponents, outer_gap};
use super::plan::Plan;
use crate::arithmetic::{Bits, Magnitude, Real};
use crate::functions::elementary::{cos, exp, exp_m1, pi, sqrt};
use rug::Rational;

/// Precision of the bounds.
const BITS: Bits = 64;

/// All bounds with their names.
pub(super) fn errors(setting: &Setting, plan: &Plan) -> Vec<(&'static str, Magnitude)> {
    let bounds = Bounds::new(setting, plan);
    vec![
        ("outer discretisation bound", bounds.outer_discretisation()),
        ("inner discretisation bound", bounds.inner_discretisation()),
        ("outer cut-off bound", bounds.outer_right(plan).add(bounds.outer_left(plan))),
        ("inner cut-off bound", bounds.inner_right(plan).add(bounds.inner_left(plan))),
    ]
}

struct Bounds<'a> {
    setting: &'a Setting,
    step: Real,
    /// `exp(E(1 - cos b))/(cos^(11/2) b (e^(2 pi b/h) - 1))`
    strip: Real,
    /// `S^3/q`
    outer: Real,
    /// `q^4 c^4`
    inner: Real,
}

impl Bounds<'_> {
    fn new<'a>(setting: &'a Setting, plan: &Plan) -> Bounds<'a> {
        let frame = &setting.frame;
        let width = Real::from_rational(&plan.strip, BITS);
        let step = Real::from_rational(&plan.step, BITS);
        let cosine = cos(&width, BITS);
        let one = Real::from_i64(1);
        let growth = exp(&setting.proper_distance.mul(&one.sub(&cosine, BITS), BITS), BITS);
        let gain = exp_m1(&pi(BITS).mul(&width, BITS).shift(1).div(&step, BITS), BITS);
        let square = cosine.square(BITS);
        let power = square.square(BITS).mul(&cosine, BITS).mul(&sqrt(&cosine, BITS), BITS);
        let product = frame.q.mul(&frame.c, BITS).square(BITS);
        let slope = frame.slope.square(BITS).mul(&frame.slope, BITS);
        Bounds {
            setting,
            step,
            strip: growth.div(&power.mul(&gain, BITS), BITS),
            outer: slope.div(&frame.q, BITS),
            inner: product.square(BITS),
        }
    }

    fn outer_discretisation(&self) -> Magnitude {
        let constant = pi(BITS).square(BITS).shift(4);
        constant.mul(&self.outer, BITS).mul(&self.strip, BITS).abs_upper()
    }

    fn inner_discretisation(&self) -> Magnitude {
        let constant = pi(BITS).shift(1).mul(&pi(BITS).add(&self.step, BITS), BITS);
        constant.mul(&self.inner, BITS).mul(&self.strip, BITS).abs_upper()
    }

    fn at(&self, index: i64) -> Real {
        self.step.mul_i64(index, BITS)
    }

    fn outer_right(&self, plan: &Plan) -> Magnitude {
        let one = Real::from_i64(1);
        let end = self.at(plan.outer_last);
        let decay = exp(&end.neg(), BITS);
        let gap = one.sub(&decay.square(BITS), BITS);
        let tail = end.add(&one, BITS).mul(&decay, BITS).div(&gap, BITS).shift(4);
        let next = self.at(plan.outer_last + 1);
        let rises = outer_gap(self.setting, &next, BITS).certainly_positive();
        let fall = if rises { self.smaller_exponential(&next, &next) } else { Magnitude::ONE };
        tail.mul(&self.outer, BITS).abs_upper().mul(fall)
    }

    fn outer_left(&self, plan: &Plan) -> Magnitude {
        if plan.outer_first <= 1 {
            return Magnitude::ZERO;
        }
        let previous = self.at(plan.outer_first - 1);
        if !outer_gap(self.setting, &previous, BITS).certainly_negative() {
            return Magnitude::INFINITY;
        }
        let constant = pi(BITS).square(BITS).shift(1);
        constant.mul(&self.outer, BITS).abs_upper().mul(self.smaller_exponential(&previous, &Real::zero()))
    }

    /// `exp(-min(Y1, Y2))` with the two exponents at different points.
    fn smaller_exponential(&self, first: &Real, second: &Real) -> Magnitude {
        let (direct, _) = outer_exponents(self.setting, first, BITS);
        let (_, mirrored) = outer_exponents(self.setting, second, BITS);
        falling(&direct).max(falling(&mirrored))
    }

    /// `(8/3) e^(-3Z) (pi/2 + h) q^4 c^4`
    fn inner_end(&self, end: &Real) -> Magnitude {
        let eight_thirds = Real::from_rational(&Rational::from((8, 3)), BITS);
        let tail = eight_thirds.mul(&exp(&end.mul_i64(-3, BITS), BITS), BITS);
        self.inner_with(&tail)
    }

    fn inner_with(&self, tail: &Real) -> Magnitude {
        tail.mul(&self.bell_sum(), BITS).mul(&self.inner, BITS).abs_upper()
    }

    /// `pi/2 + h`
    fn bell_sum(&self) -> Real {
        pi(BITS).shift(-1).add(&self.step, BITS)
    }

    fn inner_right(&self, plan: &Plan) -> Magnitude {
        self.inner_end(&self.at(plan.inner_last.max(0)))
    }

    fn inner_left(&self, plan: &Plan) -> Magnitude {
        let plain = if plan.inner_first <= 0 {
            self.inner_end(&self.at(-plan.inner_first))
        } else {
            self.inner_with(&self.bell_sum())
        };
        let gap = inner_gap(self.setting, &self.at(plan.inner_first - 1), BITS);
        if gap.certainly_negative() { plain.mul(falling(&gap.square(BITS))) } else { plain }
    }
}

/// `exp(-y)` bounded above, at most one for `y >= 0`.
fn falling(y: &Real) -> Magnitude {
    exp(&y.neg(), BITS).abs_upper().min(Magnitude::ONE)
}
