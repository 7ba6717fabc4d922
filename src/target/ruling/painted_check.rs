//! Painted millimetre paper of known geometry: heavier lines, pencil, perspective, one family, quarter turns, and what is refused.

use super::{Families, RuledPoint, Ruling, read_ruling};
use crate::{
    frames::PixelPoint,
    math::robust::mad_scale,
    photo::{Light, Noise},
    target::TargetError,
};
use nalgebra::{Matrix3, Vector3};
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};

const SIZE: [usize; 2] = [1000, 760];

struct Painted {
    /// Pixels from lines: (i, j) counts to the right and up.
    pixel_from_lines: Matrix3<f64>,
    /// Whether upright and level lines are there.
    families: [bool; 2],
    /// Lines at every fifth place are this much darker.
    heavy: f64,
    pencil: bool,
    noise: f64,
    seed: u64,
}

/// About 16 px per line, oblique by some 15 % from side to side, turned by 4°.
fn oblique() -> Matrix3<f64> {
    Matrix3::new(16.0, 1.2, 480.0, -1.1, -15.0, 390.0, 1.2e-3, -1.6e-3, 1.0)
}

fn painted(pixel_from_lines: Matrix3<f64>) -> Painted {
    Painted { pixel_from_lines, families: [true; 2], heavy: 1.0, pencil: false, noise: 0.01, seed: 1 }
}

impl Painted {
    fn lines_at(&self, x: f64, y: f64) -> [f64; 2] {
        let p = self.pixel_from_lines.try_inverse().unwrap() * Vector3::new(x, y, 1.0);
        [p.x / p.z, p.y / p.z]
    }

    fn photo(&self) -> Light {
        let mut rng = ChaCha8Rng::seed_from_u64(self.seed);
        let inverse = self.pixel_from_lines.try_inverse().unwrap();
        let light = |x: f64, y: f64| {
            let p = inverse * Vector3::new(x, y, 1.0);
            let ink: f64 = [p.x / p.z, p.y / p.z]
                .into_iter()
                .zip(self.families)
                .filter(|(_, drawn)| *drawn)
                .map(|(n, _)| {
                    let heavier = if n.round().rem_euclid(5.0) == 0.0 { 1.0 + self.heavy } else { 1.0 };
                    // A line blurred to 0.1 of the distance of lines.
                    0.12 * heavier * (-((n - n.round()) / 0.1).powi(2) / 2.0).exp()
                })
                .sum();
            let pencil =
                self.pencil && ((x - 300.0).abs() < 3.0 || (y - 0.7 * x - 40.0).abs() < 4.0 || (x - 640.0).hypot(y - 420.0) < 60.0);
            let shade = 0.5 * (1.0 - 0.4 * x / SIZE[0] as f64);
            if pencil { 0.08 } else { shade * (1.0 - ink).max(0.1) }
        };
        let value = (0..SIZE[0] * SIZE[1])
            .map(|n| {
                let noise: f64 = StandardNormal.sample(&mut rng);
                (light((n % SIZE[0]) as f64, (n / SIZE[0]) as f64) + self.noise * noise).max(0.0) as f32
            })
            .collect();
        Light { width: SIZE[0], height: SIZE[1], value, noise: Noise { a: self.noise * self.noise, b: 0.0 } }
    }

    /// Offsets of crossings from whole lines in lines and in standard uncertainties; asserts that their numbers are right but for the origin.
    fn pulls(&self, ruling: &Ruling) -> Vec<f64> {
        let mut origin = None;
        let mut pulls = Vec::new();
        for point in &ruling.points {
            let RuledPoint::Crossing { at, index, covariance } = *point else { panic!("{point:?}") };
            let place = self.lines_at(at.x_px, at.y_px);
            let whole = place.map(f64::round);
            let number = [0, 1].map(|c| whole[c] as i32 - index[c]);
            assert_eq!(*origin.get_or_insert(number), number, "{point:?}");
            let back = self.pixel_from_lines * Vector3::new(whole[0], whole[1], 1.0);
            let (dx, dy) = (at.x_px - back.x / back.z, at.y_px - back.y / back.z);
            pulls.extend([dx / covariance.xx.sqrt(), dy / covariance.yy.sqrt()]);
            assert!(dx.hypot(dy) < 0.5, "{point:?} is off by {dx}, {dy}");
        }
        pulls
    }
}

fn rms(values: &[f64]) -> f64 {
    (values.iter().map(|v| v * v).sum::<f64>() / values.len() as f64).sqrt()
}

#[test]
fn millimetre_paper_in_perspective() {
    for (heavy, pencil, noise) in [(0.0, false, 0.01), (1.0, false, 0.03), (2.0, true, 0.03)] {
        let painted = Painted { heavy, pencil, noise, ..painted(oblique()) };
        let ruling = read_ruling(&painted.photo()).unwrap();
        let pulls = painted.pulls(&ruling);
        println!("heavy {heavy} pencil {pencil}: {} points, rms pull {:.2}", ruling.points.len(), rms(&pulls));
        assert_eq!(ruling.families, Families::Both);
        assert!(ruling.points.len() >= 40, "{} points", ruling.points.len());
        assert!((13.0..18.0).contains(&ruling.period_px), "{}", ruling.period_px);
        // Crossings that a pencil line runs through are off by more than they say; few, so that a robust fit drops them.
        let usual = mad_scale(&pulls).unwrap();
        let wild = pulls.iter().filter(|pull| pull.abs() > 4.3).count();
        assert!((0.5..1.5).contains(&usual), "usual pull {usual}");
        // Without pencil one in a hundred: at the rim of the photo the bend of the count is known from one side only.
        let few = if pencil { 10 } else { 100 };
        assert!(few * wild <= pulls.len(), "{wild} of {} are wild", pulls.len());
        assert!(pencil || rms(&pulls) < 1.5, "rms pull {}", rms(&pulls));
    }
}

#[test]
fn one_family_of_lines() {
    for (families, want) in [([true, false], Families::Upright), ([false, true], Families::Level)] {
        let painted = Painted { families, ..painted(oblique()) };
        let ruling = read_ruling(&painted.photo()).unwrap();
        assert_eq!(ruling.families, want);
        let axis = usize::from(want == Families::Level);
        let mut origin = None;
        for point in &ruling.points {
            let RuledPoint::OnLine { at, index, .. } = *point else { panic!("{point:?}") };
            let n = painted.lines_at(at.x_px, at.y_px)[axis];
            assert!((n - n.round()).abs() < 0.03, "{n}");
            assert_eq!(*origin.get_or_insert(n.round() as i32 - index), n.round() as i32 - index);
        }
        assert!(ruling.points.len() >= 40);
    }
}

/// Turned by 90° the same crossings are seen, X and Y as the turned photo shows them.
#[test]
fn a_quarter_turn_turns_the_numbers() {
    let light = painted(oblique()).photo();
    let (w, h) = (light.width, light.height);
    // Clockwise: (x, y) goes to (h - 1 - y, x).
    let value = (0..w * h).map(|n| light.value[(h - 1 - n % h) * w + n / h]).collect();
    let turned = read_ruling(&Light { width: h, height: w, value, noise: light.noise }).unwrap();
    let painted = painted(oblique());
    let mut origin = None;
    for point in &turned.points {
        let RuledPoint::Crossing { at: PixelPoint { x_px, y_px }, index: [i, j], .. } = *point else { panic!("{point:?}") };
        let place = painted.lines_at(y_px, (h - 1) as f64 - x_px).map(|n| n.round() as i32);
        // Up in the photo has become right, left has become up.
        let number = [place[1] - i, -place[0] - j];
        assert_eq!(*origin.get_or_insert(number), number, "{point:?}");
    }
    assert!(turned.points.len() >= 40);
}

#[test]
fn what_is_no_ruling_is_refused() {
    let none = Painted { families: [false; 2], ..painted(oblique()) };
    assert!(matches!(read_ruling(&none.photo()), Err(TargetError::NoRuling { .. })));
    let fine = Matrix3::new(3.2, 0.1, 480.0, 0.1, -3.2, 390.0, 0.0, 0.0, 1.0);
    let error = read_ruling(&Painted { heavy: 0.0, noise: 0.002, ..painted(fine) }.photo()).unwrap_err();
    assert!(matches!(error, TargetError::RulingTooFine { .. } | TargetError::NoRuling { .. }), "{error}");
    let nan = Light { width: 200, height: 200, value: vec![f32::NAN; 40_000], noise: Noise { a: 0.0, b: 0.0 } };
    assert!(read_ruling(&nan).is_err());
}
