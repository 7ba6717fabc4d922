//! The opening of one cell: its form factor is the envelope of the orders.

use serde::{Deserialize, Serialize};
use std::f64::consts::PI;

/// A clear opening in an opaque sheet (or, by Babinet, an opaque patch: the same but for the zero order).
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(tag = "shape", rename_all = "kebab-case", deny_unknown_fields)]
pub enum Opening {
    /// A disc.
    Disc {
        /// Radius, m.
        radius_m: f64,
    },
    /// A rectangle along the first lattice vector.
    Rectangle {
        /// Along the first lattice vector and across it, m.
        size_m: [f64; 2],
    },
    /// A slit across the grating vector.
    Slit {
        /// Width, m.
        width_m: f64,
    },
}

impl Opening {
    /// Squared modulus of the Fraunhofer amplitude at spatial frequency `g`, 1 at g = 0.
    ///
    /// Disc: `(2 J1(x)/x)²`, x = 2π R |g|; rectangle: `sinc²(w g_x) sinc²(h g_y)`; slit: `sinc²(w g_x)`, with sinc t = sin πt / πt.
    ///
    /// - `g_per_m`: along the first lattice vector and across it, cycles per metre
    ///
    /// Source: Born & Wolf, Principles of Optics, section 8.5.
    #[must_use]
    pub fn envelope(&self, g_per_m: [f64; 2]) -> f64 {
        match *self {
            Self::Disc { radius_m } => {
                let x = 2.0 * PI * radius_m * g_per_m[0].hypot(g_per_m[1]);
                // 2 J1(x)/x = 1 - x²/8 near zero.
                if x < 1e-4 { 1.0 } else { (2.0 * bessel_j1(x) / x).powi(2) }
            }
            Self::Rectangle { size_m } => (sinc(size_m[0] * g_per_m[0]) * sinc(size_m[1] * g_per_m[1])).powi(2),
            Self::Slit { width_m } => sinc(width_m * g_per_m[0]).powi(2),
        }
    }
}

fn sinc(t: f64) -> f64 {
    let x = PI * t;
    if x.abs() < 1e-6 { 1.0 } else { x.sin() / x }
}

/// Bessel function of the first kind, order one, x in 0..1000.
///
/// `J1(x) = (1/π) ∫ cos(τ − x sin τ) dτ` over 0..π (DLMF 10.9.2). Over a full period the integrand is periodic and entire, so the
/// trapezoidal rule converges faster than any power once it has more than x points.
fn bessel_j1(x: f64) -> f64 {
    let points = 24 + super::pixels::ceil_to_i32(x);
    let step = 2.0 * PI / f64::from(points);
    let sum: f64 = (0..points).map(|i| f64::from(i) * step).map(|tau| (tau - x * tau.sin()).cos()).sum();
    sum / f64::from(points)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// First zeros and values of J1: Abramowitz & Stegun, tables 9.1 and 9.5.
    #[test]
    fn bessel_function_agrees_with_published_values() {
        assert!((bessel_j1(1.0) - 0.440_050_585_7).abs() < 1e-10);
        assert!((bessel_j1(10.0) - 0.043_472_746_2).abs() < 1e-10);
        for zero in [3.831_705_97, 7.015_586_67, 16.470_630_05] {
            assert!(bessel_j1(zero).abs() < 1e-8, "{zero}");
        }
    }

    /// Common practice: a slit of half the pitch has no even orders.
    #[test]
    fn a_slit_of_half_the_pitch_has_no_even_orders() {
        let slit = Opening::Slit { width_m: 0.5e-6 };
        assert!(slit.envelope([2e6, 0.0]) < 1e-30);
        assert!((slit.envelope([1e6, 0.0]) - (2.0 / PI).powi(2)).abs() < 1e-12);
        assert!((slit.envelope([0.0, 0.0]) - 1.0).abs() < 1e-15);
    }

    #[test]
    fn the_airy_envelope_is_one_in_the_middle_and_zero_on_the_dark_ring() {
        let disc = Opening::Disc { radius_m: 1e-6 };
        assert!((disc.envelope([0.0, 0.0]) - 1.0).abs() < 1e-15);
        assert!((disc.envelope([1e2, 0.0]) - 1.0).abs() < 1e-6);
        assert!(disc.envelope([0.0, 3.831_705_97 / (2.0 * PI * 1e-6)]) < 1e-15);
    }
}
