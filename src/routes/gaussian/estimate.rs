//! A rough size of the tail, for choosing precisions only.
//!
//! With `p = sinh z`, `z = eta + i theta`, the integrand of `psi(x)` is entire in `z`, so the size of `psi` is about
//! that of the integrand at the pass over which the lowest path from the far left to the far right must go. On a grid
//! of `(eta, theta)` the lowest such path is found by dynamic programming, column by column: the height of the best
//! path to a point is the larger of the point's own height and the lowest of its neighbours' in the last column. With
//! `theta >= 0` only, as the pole of the kernel lies at `theta = 0`, the path stays at height zero once the packet has
//! reached the region. `P` is then about the square of `psi`.

use super::Estimates;
use std::f64::consts::PI;

const COLUMNS: usize = 240;
const ROWS: usize = 56;
/// A little beyond the branch cut at `pi/2`, where the pass lies for tiny packets.
const TOP: f64 = 0.55 * PI;

/// A rough natural logarithm of `P(x > from)`, never above zero.
pub(crate) fn log_right_tail(packet: Estimates, from: f64) -> f64 {
    let (s, k, t) = (packet.sigma, packet.momentum, packet.time);
    if t == 0.0 {
        // The normal distribution; without time there is no branch cut in the way.
        return -from.max(0.0).powi(2) / (2.0 * s * s);
    }
    let far = from.abs() + t.abs();
    // To where the gaussian is far below the tail, and around the pass at Im p = R/(2 s^2) of a gaussian that has not moved.
    let reach = ((60.0 + 3.0 * far).sqrt() + 3.0) / s + 2.0 * far / (s * s);
    let (low, high) = ((k - reach).asinh(), (k + reach).asinh());
    let angles: Vec<(f64, f64)> = (0..ROWS).map(|i| (TOP * i as f64 / (ROWS - 1) as f64).sin_cos()).collect();
    let mut best = [f64::NEG_INFINITY; ROWS];
    for column in 0..COLUMNS {
        let eta = low + (high - low) * column as f64 / (COLUMNS - 1) as f64;
        let (u, w) = (eta.sinh(), eta.cosh());
        let height = |row: usize| {
            let (sine, cosine) = angles[row];
            s * s * (w * sine - u * cosine + k) * (w * sine + u * cosine - k) + (t * u - from * w) * sine
        };
        let mut next = [0.0; ROWS];
        for (row, value) in next.iter_mut().enumerate() {
            let below = best[row.saturating_sub(1)];
            let above = best[(row + 1).min(ROWS - 1)];
            *value = height(row).max(best[row].min(below).min(above));
        }
        // Vertical moves inside the column.
        for row in 1..ROWS {
            next[row] = next[row].min(next[row - 1].max(height(row)));
        }
        for row in (0..ROWS - 1).rev() {
            next[row] = next[row].min(next[row + 1].max(height(row)));
        }
        best = next;
    }
    let lowest = best.iter().copied().fold(f64::INFINITY, f64::min);
    (2.0 * lowest).min(0.0)
}
