//! Paints discs into a plane of light as a camera would see them, for tests.

use crate::photo::{Light, Noise};

/// Where a printed place falls in the photo.
pub(super) type Project<'a> = &'a dyn Fn([f64; 2]) -> [f64; 2];

/// A black disc on the print.
#[derive(Debug, Clone, Copy)]
pub(super) struct PrintedDisc {
    pub(super) at: [f64; 2],
    pub(super) radius: f64,
}

/// Light of the paper everywhere, ink and blur.
pub(super) struct Scene<'a> {
    pub(super) size: [usize; 2],
    pub(super) discs: &'a [PrintedDisc],
    pub(super) project: Project<'a>,
    /// Share of the paper's light that ink gives back.
    pub(super) ink: f64,
    /// Standard deviation of the blur, px.
    pub(super) blur_px: f64,
    /// Light of the bare paper at a pixel.
    pub(super) paper: &'a dyn Fn(f64, f64) -> f64,
    /// Light that comes on top of paper and ink alike (laser spots, veiling glare).
    pub(super) glow: &'a dyn Fn(f64, f64) -> f64,
    /// Standard deviation of the noise, relative to the paper's light.
    pub(super) noise: f64,
    pub(super) seed: u64,
}

/// The scene as linear light. Each disc's image is bounded by a fine polygon; a pixel's ink share follows from
/// its distance to that rim through the blur (a straight edge: true to blur² / radius²).
pub(super) fn paint(scene: &Scene) -> Light {
    let [width, height] = scene.size;
    let mut share = vec![0.0_f64; width * height];
    for disc in scene.discs {
        paint_disc(&mut share, disc, scene);
    }
    let mut state = scene.seed.wrapping_mul(0x9E37_79B9_7F4A_7C15) | 1;
    let mut uniform = move || {
        state ^= state << 13;
        state ^= state >> 7;
        state ^= state << 17;
        (state >> 11) as f64 / (1_u64 << 53) as f64
    };
    let value = (0..width * height)
        .map(|n| {
            let paper = (scene.paper)((n % width) as f64, (n / width) as f64);
            // Sum of uniforms: close enough to normal for a test.
            let noise = scene.noise * ((0..6).map(|_| uniform()).sum::<f64>() - 3.0) * 2.0_f64.sqrt();
            let glow = (scene.glow)((n % width) as f64, (n / width) as f64);
            (paper * (1.0 - share[n] * (1.0 - scene.ink)) + paper * noise + glow).clamp(0.0, 1.0) as f32
        })
        .collect();
    Light { width, height, value, noise: Noise { a: 0.0, b: 0.0 } }
}

fn paint_disc(share: &mut [f64], disc: &PrintedDisc, scene: &Scene) {
    const CORNERS: usize = 72;
    let rim: Vec<[f64; 2]> = (0..CORNERS)
        .map(|n| n as f64 / CORNERS as f64 * std::f64::consts::TAU)
        .map(|a| (scene.project)([disc.at[0] + disc.radius * a.cos(), disc.at[1] + disc.radius * a.sin()]))
        .collect();
    let reach = 5.0 * scene.blur_px + 1.0;
    let range = |c: usize, size: usize| {
        let (low, high) = rim.iter().map(|p| p[c]).fold((f64::MAX, f64::MIN), |(l, h), v| (l.min(v), h.max(v)));
        (low - reach).max(0.0) as usize..(high + reach + 1.0).clamp(0.0, size as f64) as usize
    };
    for y in range(1, scene.size[1]) {
        for x in range(0, scene.size[0]) {
            let distance = signed_distance(&rim, [x as f64, y as f64]);
            let z = distance / (scene.blur_px.max(0.29) * std::f64::consts::SQRT_2);
            let ink = 0.5 * (1.0 + erf(z));
            let place = &mut share[y * scene.size[0] + x];
            *place = place.max(ink);
        }
    }
}

/// Distance to a convex rim, positive inside.
fn signed_distance(rim: &[[f64; 2]], p: [f64; 2]) -> f64 {
    let (mut nearest, mut crossings) = (f64::MAX, 0);
    for n in 0..rim.len() {
        let (a, b) = (rim[n], rim[(n + 1) % rim.len()]);
        let (abx, aby) = (b[0] - a[0], b[1] - a[1]);
        let t = (((p[0] - a[0]) * abx + (p[1] - a[1]) * aby) / (abx * abx + aby * aby)).clamp(0.0, 1.0);
        nearest = nearest.min((p[0] - a[0] - t * abx).hypot(p[1] - a[1] - t * aby));
        if (a[1] > p[1]) != (b[1] > p[1]) && p[0] < a[0] + (p[1] - a[1]) / aby * abx {
            crossings += 1;
        }
    }
    if crossings % 2 == 1 { nearest } else { -nearest }
}

/// Error function, Abramowitz & Stegun 7.1.26 (|error| < 1.5e-7).
fn erf(x: f64) -> f64 {
    let t = 1.0 / (1.0 + 0.327_591_1 * x.abs());
    let poly = t * (0.254_829_592 + t * (-0.284_496_736 + t * (1.421_413_741 + t * (-1.453_152_027 + t * 1.061_405_429))));
    (1.0 - poly * (-x * x).exp()).copysign(x)
}
