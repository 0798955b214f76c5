//! Each error bound by itself: a panel is computed with one thing made coarse, and compared with a fine one.
//!
//! The deviation has to stay within the bound, and to exceed what the bound would be if the coarse thing were
//! forgotten in it: so each of these tests fails without the part of the bound that it is about.

use super::expansion::Expansion;
use super::near::{all_series, at_common_point, at_cone, at_far_end, on_panel};
use super::*;
use crate::functions::elementary::ln;
use rug::Integer;

fn q(n: i64, d: i64) -> Rational {
    Rational::from((n, d))
}

fn sides() -> Vec<Side> {
    let shapes = [
        PiecewisePacket::uniform_ball(&q(1, 3)).unwrap(),
        PiecewisePacket::bspline(&q(1, 2), 3).unwrap(),
        PiecewisePacket::bspline(&q(2, 5), 2).unwrap().with_momentum(&q(-7, 2)).unwrap(),
        PiecewisePacket::cosine(&q(1, 1), 2).unwrap(),
        PiecewisePacket::cosine(&q(1, 4), 3).unwrap(),
    ];
    let side = |packet: &PiecewisePacket| Side {
        shape: Shape::new(packet, &q(1, 1)),
        time: q(3, 4),
        distance: q(0, 1),
        times: 1,
    };
    shapes.iter().map(side).collect()
}

fn at(list: &[Integer], x: &Rational, scale: u32) -> Real {
    let x = Real::from_rational(x, 600);
    list.iter()
        .rev()
        .fold(Real::zero(), |sum, value| sum.mul(&x, 600).add(&Real::from_scaled(value, -i64::from(scale)), 600))
}

/// Largest difference of two expansions over `1 + |ln x|`, component by component, at some points.
fn deviation(first: (&Expansion, u32), second: (&Expansion, u32), points: &[Rational]) -> Magnitude {
    let mut largest = Magnitude::ZERO;
    for x in points {
        let log = if *x > 0 { ln(&Real::from_rational(x, 600), 600) } else { Real::zero() };
        let value = |(e, scale): (&Expansion, u32), im: bool| {
            let (regular, logarithm) =
                if im { (&e.regular.im, &e.logarithm.im) } else { (&e.regular.re, &e.logarithm.re) };
            at(regular, x, scale).add(&at(logarithm, x, scale).mul(&log, 600), 600)
        };
        let below = Real::from_i64(1).add(&log.abs(), 600).abs_lower();
        for im in [false, true] {
            let difference = value(first, im).sub(&value(second, im), 600).abs_lower();
            largest = largest.max(difference.div(below));
        }
    }
    largest
}

fn everywhere() -> Vec<Rational> {
    (-8..=8).map(|n| q(n, 8)).collect()
}

fn beyond_zero() -> Vec<Rational> {
    (1..=8).map(|n| q(n, 8)).chain([q(1, 1000)]).collect()
}

/// The coarse one must be off by more than the fine bound, and by less than its own.
fn check(name: &str, fine: (&Expansion, u32), coarse: (&Expansion, u32), points: &[Rational]) -> bool {
    let off = deviation(fine, coarse, points);
    let allowed = fine.0.error.add(coarse.0.error);
    assert!(off.cmp_value(allowed).is_le(), "{name}: off by {:?}, bound {:?}", off.to_float(), allowed.to_float());
    off.cmp_value(fine.0.error.shift(4)).is_gt()
}

#[test]
fn far_panels_keep_their_bounds() {
    let effort = Effort::default();
    for (index, side) in sides().iter().enumerate() {
        let plan = Plan::new(side, 30).unwrap();
        let scale = plan.moment_scale;
        let kappa = wave_number(side, scale + 96);
        let count = plan.far.iter().map(|panel| panel.moments).max().unwrap();
        let moments = Moments::new(&side.shape, kappa.as_ref(), count, scale, &effort).unwrap();
        let few = Moments::new(&side.shape, kappa.as_ref(), count, scale / 3, &effort).unwrap();
        let mut alive = [false; 5];
        for panel in &plan.far {
            let (from, to) = (panel.from.clone(), panel.to.clone());
            let plain = || FarPanel { from: from.clone(), to: to.clone(), ..*panel };
            let fine = far::on_panel(side, panel, &moments, &effort).unwrap();
            let changed = [
                (FarPanel { terms: panel.terms / 2, ..plain() }, &moments),
                (FarPanel { moments: panel.moments / 2, ..plain() }, &moments),
                (FarPanel { scale: panel.scale / 2, ..plain() }, &moments),
                (FarPanel { moment_scale: panel.moment_scale / 2, ..plain() }, &moments),
                (plain(), &few),
            ];
            for (alive, (coarse_panel, moments)) in alive.iter_mut().zip(&changed) {
                let coarse = far::on_panel(side, coarse_panel, moments, &effort).unwrap();
                let pair = ((&fine, panel.scale), (&coarse, coarse_panel.scale));
                *alive |= check(&format!("packet {index}, far"), pair.0, pair.1, &everywhere());
            }
        }
        assert!(alive.iter().all(|alive| *alive), "packet {index}: {alive:?}");
    }
}

/// All `Q` from the outermost near panel to the cone.
fn near(side: &Side, plan: &Plan) -> Vec<(Expansion, u32)> {
    let effort = Effort::default();
    let series = all_series(side, plan, &effort).unwrap();
    let mut carried =
        if plan.far.is_empty() { at_far_end(side, plan) } else { at_common_point(side, plan, &effort).unwrap() };
    let mut list = Vec::new();
    for (panel, series) in plan.panels.iter().zip(&series).rev() {
        let (q, next) = on_panel(side, panel, series, &carried).unwrap();
        carried = next;
        list.push((q, panel.scale));
    }
    let cone = plan.cone.as_ref().unwrap();
    list.push((at_cone(side, cone, &carried, &effort).unwrap(), cone.scale));
    list
}

#[test]
fn near_panels_keep_their_bounds() {
    for (index, side) in sides().iter().enumerate() {
        let fine_plan = Plan::new(side, 30).unwrap();
        let fine = near(side, &fine_plan);
        let coarsen: [&dyn Fn(&mut Panel); 2] =
            [&|panel| panel.scale /= 2, &|panel| panel.terms.iter_mut().for_each(|terms| *terms = (*terms / 2).max(3))];
        for (which, change) in coarsen.iter().enumerate() {
            // Coarse panels only outside (their errors are carried inward), only near, only at the cone.
            for place in 0..3 {
                let mut plan = Plan::new(side, 30).unwrap();
                match place {
                    0 => plan.extensions.iter_mut().flatten().for_each(change),
                    1 => plan.panels.iter_mut().for_each(change),
                    _ => plan.cone.iter_mut().for_each(change),
                }
                let coarse = near(side, &plan);
                let mut alive = false;
                for (number, (fine, coarse)) in fine.iter().zip(&coarse).enumerate() {
                    let points = if number + 1 == coarse_count(&plan) { beyond_zero() } else { everywhere() };
                    let name = format!("packet {index}, change {which} at {place}, panel {number}");
                    alive |= check(&name, (&fine.0, fine.1), (&coarse.0, coarse.1), &points);
                }
                assert!(alive, "packet {index}, change {which} at {place}");
            }
        }
    }
}

fn coarse_count(plan: &Plan) -> usize {
    plan.panels.len() + 1
}

/// With constants from infinity and from the common point, `Q` is the same.
#[test]
fn constants_do_not_matter() {
    for side in sides() {
        let plan = Plan::new(&side, 20).unwrap();
        assert!(!plan.far.is_empty() && !plan.panels.is_empty());
        let first = near(&side, &plan);
        let mut from_infinity = Plan::new(&side, 20).unwrap();
        let far: Vec<FarPanel> = from_infinity.far.drain(..).collect();
        let terms = |panel: &Panel| panel.terms.clone();
        let inner = from_infinity.panels.last().map(terms).unwrap();
        for panel in far {
            // Doubling panels need about as many terms; the scale is generous.
            let more = inner.iter().map(|terms| 3 * terms + 60).collect();
            from_infinity.panels.push(Panel { from: panel.from, to: panel.to, terms: more, scale: 400, squared: true });
        }
        let second = near(&side, &from_infinity);
        let skipped = second.len() - first.len();
        for (x, y) in first.iter().zip(&second[skipped..]) {
            let off = deviation((&x.0, x.1), (&y.0, y.1), &beyond_zero());
            assert!(off.cmp_value(x.0.error.add(y.0.error)).is_le());
        }
    }
}
