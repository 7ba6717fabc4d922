//! Reads painted targets: every dot, every index, under views and sizes that the corpus does not hold.

use super::{
    Paper, ReadOptions, Reading, Sheet, TargetError, is_mark,
    painter::{PrintedDisc, Scene, paint},
    pdf, read, svg,
};
use crate::photo::Light;

/// A pinhole camera looking at the print plane (units of a pitch), with first radial distortion.
struct Eye {
    size: [usize; 2],
    f_px: f64,
    /// Turn of the camera about the vertical and about the line of sight, rad.
    slant_rad: f64,
    roll_rad: f64,
    distance: f64,
    k1: f64,
    mirrored: f64,
}

impl Eye {
    fn square_on(size: [usize; 2], px_per_pitch: f64) -> Self {
        Self {
            size,
            f_px: 1.2 * size[0] as f64,
            slant_rad: 0.0,
            roll_rad: 0.0,
            distance: 1.2 * size[0] as f64 / px_per_pitch,
            k1: 0.0,
            mirrored: 1.0,
        }
    }

    fn project(&self, p: [f64; 2]) -> [f64; 2] {
        let (x, y) = (self.mirrored * p[0], -p[1]);
        let (x, y) = (self.roll_rad.cos() * x - self.roll_rad.sin() * y, self.roll_rad.sin() * x + self.roll_rad.cos() * y);
        let depth = self.distance + x * self.slant_rad.sin();
        let (u, v) = (x * self.slant_rad.cos() / depth, y / depth);
        let radial = 1.0 + self.k1 * (u * u + v * v);
        [u * radial * self.f_px + (self.size[0] as f64 - 1.0) / 2.0, v * radial * self.f_px + (self.size[1] as f64 - 1.0) / 2.0]
    }
}

fn grid(columns: std::ops::RangeInclusive<i32>, rows: std::ops::RangeInclusive<i32>) -> Vec<((i32, i32), PrintedDisc)> {
    rows.flat_map(|j| columns.clone().map(move |i| (i, j)))
        .map(|index| {
            let radius = if is_mark(index) { 0.35 } else { 0.2 };
            (index, PrintedDisc { at: [f64::from(index.0), f64::from(index.1)], radius })
        })
        .collect()
}

fn photo(eye: &Eye, dots: &[((i32, i32), PrintedDisc)], blur_px: f64, noise: f64) -> Light {
    let discs: Vec<PrintedDisc> = dots.iter().map(|d| d.1).collect();
    let (w, h) = (eye.size[0] as f64, eye.size[1] as f64);
    paint(&Scene {
        size: eye.size,
        discs: &discs,
        project: &|p| eye.project(p),
        ink: 0.08,
        blur_px,
        paper: &|x, y| 0.5 * (1.0 + 0.3 * (x / w - 0.5) - 0.2 * (y / h - 0.5)),
        glow: &|_, _| 0.0,
        noise,
        seed: 7,
    })
}

/// The whole disc and a margin lie in the photo.
fn complete(eye: &Eye, d: &PrintedDisc) -> bool {
    rim(eye, d).iter().all(|[x, y]| *x > 8.0 && *y > 8.0 && *x < eye.size[0] as f64 - 9.0 && *y < eye.size[1] as f64 - 9.0)
}

fn count_complete(eye: &Eye, dots: &[((i32, i32), PrintedDisc)]) -> usize {
    dots.iter().filter(|(_, disc)| complete(eye, disc)).count()
}

fn rim(eye: &Eye, d: &PrintedDisc) -> Vec<[f64; 2]> {
    (0..360).map(|n| f64::from(n).to_radians()).map(|a| eye.project([d.at[0] + d.radius * a.cos(), d.at[1] + d.radius * a.sin()])).collect()
}

/// Centre of the disc's image, an ellipse but for distortion: the middle of its extremes.
fn rim_middle(eye: &Eye, d: &PrintedDisc) -> [f64; 2] {
    let rim = rim(eye, d);
    [0, 1].map(|c| {
        let (low, high) = rim.iter().map(|p| p[c]).fold((f64::MAX, f64::MIN), |(l, h), v| (l.min(v), h.max(v)));
        f64::midpoint(low, high)
    })
}

/// Found dots against the painted ones: all present, right index, within `within_px` of the middle of the disc's image.
fn assert_read(reading: &Reading, eye: &Eye, dots: &[((i32, i32), PrintedDisc)], within_px: f64, what: &str) {
    let found: std::collections::HashMap<_, _> = reading.dots.iter().map(|d| (d.index, d.at)).collect();
    let mut expected = 0;
    for (index, disc) in dots {
        if !complete(eye, disc) {
            continue;
        }
        expected += 1;
        let at = found.get(index).unwrap_or_else(|| panic!("{what}: dot {index:?} is missing"));
        let middle = rim_middle(eye, disc);
        let off = (at.x_px - middle[0]).hypot(at.y_px - middle[1]);
        assert!(off < within_px, "{what}: dot {index:?} is off by {off} px");
    }
    assert!(expected >= 12, "{what}: the test itself shows only {expected} dots");
    for dot in &reading.dots {
        assert!(dots.iter().any(|(index, _)| *index == dot.index), "{what}: invented dot {:?}", dot.index);
        assert_eq!(dot.mark, is_mark(dot.index));
    }
}

#[test]
fn small_and_large_dots() {
    for (size, px_per_pitch, blur_px) in
        [([640, 480], 15.0, 0.7), ([640, 480], 20.0, 1.0), ([900, 700], 80.0, 1.5), ([1400, 1100], 200.0, 2.5), ([2000, 1500], 300.0, 2.0)]
    {
        let eye = Eye::square_on(size, px_per_pitch);
        let dots = grid(-25..=25, -20..=20);
        let reading = read(&photo(&eye, &dots, blur_px, 0.01), &ReadOptions::default()).unwrap();
        assert_read(&reading, &eye, &dots, 0.2, &format!("{px_per_pitch} px per pitch"));
        for (got, want) in [(reading.dot_radius_pitches, 0.2), (reading.mark_radius_pitches, 0.35)] {
            // The painter blurs straight edges: its discs are larger by blur² / radius² in area.
            let painted = want * (1.0 + (blur_px / (want * px_per_pitch)).powi(2) / 2.0);
            assert!((got - painted).abs() < 0.01 * want, "{px_per_pitch} px per pitch: got {got}, painted {painted}");
        }
    }
}

#[test]
fn five_by_four_dots_alone_on_the_paper() {
    let eye = Eye::square_on([1200, 900], 60.0);
    let dots = grid(-1..=3, -1..=2);
    let reading = read(&photo(&eye, &dots, 1.2, 0.02), &ReadOptions::default()).unwrap();
    assert_read(&reading, &eye, &dots, 0.15, "5 x 4");
    assert_eq!(reading.dots.len(), 20);
}

#[test]
fn oblique_rolled_and_distorted() {
    for (slant_deg, roll_deg, k1) in [(45.0, 0.0, 0.0), (-45.0, 30.0, -0.2), (40.0, 135.0, 0.2), (0.0, 180.0, -0.3), (30.0, -90.0, 0.1)] {
        let mut eye = Eye::square_on([1400, 1100], 60.0);
        (eye.slant_rad, eye.roll_rad, eye.k1) = (f64::to_radians(slant_deg), f64::to_radians(roll_deg), k1);
        let dots = grid(-8..=8, -6..=6);
        let reading = read(&photo(&eye, &dots, 1.2, 0.02), &ReadOptions::default()).unwrap();
        assert_read(&reading, &eye, &dots, 0.2, &format!("slant {slant_deg}, roll {roll_deg}, k1 {k1}"));
    }
}

#[test]
fn a_mirrored_photo_is_named() {
    let mut eye = Eye::square_on([900, 700], 60.0);
    eye.mirrored = -1.0;
    let got = read(&photo(&eye, &grid(-5..=5, -4..=4), 1.2, 0.02), &ReadOptions::default());
    assert!(matches!(got, Err(TargetError::Mirrored)), "{got:?}");
}

#[test]
fn photos_without_a_target_are_refused() {
    let eye = Eye::square_on([900, 700], 60.0);
    let blank = photo(&eye, &[], 1.0, 0.02);
    assert!(matches!(read(&blank, &ReadOptions::default()), Err(TargetError::NoDots { .. })));
    let mut unmarked = grid(-5..=5, -4..=4);
    for (_, disc) in &mut unmarked {
        disc.radius = 0.2;
    }
    let got = read(&photo(&eye, &unmarked, 1.0, 0.02), &ReadOptions::default());
    assert!(matches!(got, Err(TargetError::MarksNotFound { dots: 99, larger: 0 })), "{got:?}");
    let got = read(&photo(&eye, &unmarked, 1.0, 0.02), &ReadOptions { marks: super::Marks::Absent, ..ReadOptions::default() }).unwrap();
    assert_eq!(got.dots.len(), 99);
    assert!(got.dots.iter().any(|d| d.index == (1, 0) && d.at.x_px > 449.5 + 55.0));
    assert!(got.dots.iter().any(|d| d.index == (0, 1) && d.at.y_px < 349.5 - 55.0));
}

#[test]
fn senseless_planes_are_refused() {
    for value in [0.0, f32::NAN, f32::INFINITY, -1.0, 0.5] {
        let light = Light { width: 64, height: 64, value: vec![value; 4096], noise: crate::photo::Noise { a: 0.0, b: 0.0 } };
        assert!(read(&light, &ReadOptions::default()).is_err());
    }
    for (width, height, n) in [(0, 0, 0), (1, 1, 1), (64, 64, 7), (usize::MAX, 2, 4)] {
        let light = Light { width, height, value: vec![0.5; n], noise: crate::photo::Noise { a: 0.0, b: 0.0 } };
        assert!(matches!(read(&light, &ReadOptions::default()), Err(TargetError::PhotoTooSmall { .. })));
    }
}

/// The circles of the SVG are what the reader reads: draw, photograph, read.
#[test]
fn the_printed_sheet_reads_back() {
    for (paper, pitch_mm) in [(Paper::A4, 10.0), (Paper::A3, 20.0), (Paper::Letter, 15.0)] {
        let sheet = Sheet::new(paper, pitch_mm * 1e-3).unwrap();
        let text = svg(&sheet);
        let number = |line: &str, name: &str| -> f64 {
            line.split(&format!("{name}=\"")).nth(1).unwrap().split('"').next().unwrap().parse().unwrap()
        };
        let [_, height] = paper.size_mm();
        let discs: Vec<PrintedDisc> = text
            .lines()
            .filter(|line| line.starts_with("<circle"))
            .map(|line| PrintedDisc { at: [number(line, "cx"), height - number(line, "cy")], radius: number(line, "r") })
            .collect();
        let (columns, rows) = sheet.columns_and_rows();
        let [left, low] = [0, 1].map(|c| discs.iter().map(|d| d.at[c]).fold(f64::MAX, f64::min));
        let origin = [left + f64::from(columns / 2) * pitch_mm, low + f64::from(rows / 2) * pitch_mm];
        let dots: Vec<((i32, i32), PrintedDisc)> = discs
            .iter()
            .map(|d| {
                let at = [(d.at[0] - origin[0]) / pitch_mm, (d.at[1] - origin[1]) / pitch_mm];
                ((at[0].round() as i32, at[1].round() as i32), PrintedDisc { at, radius: d.radius / pitch_mm })
            })
            .collect();
        let mut eye = Eye::square_on([1600, 1200], 1500.0 / f64::from(columns + 3));
        eye.slant_rad = 0.3;
        let reading = read(&photo(&eye, &dots, 1.2, 0.015), &ReadOptions::default()).unwrap();
        assert_read(&reading, &eye, &dots, 0.2, &format!("{paper:?}"));
        assert_eq!(reading.dots.len(), discs.len(), "{paper:?}");
    }
}

/// The ready-made targets are what the program draws today; `UPDATE=1` writes them anew.
#[test]
fn ready_made_targets_are_current() {
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("calibration");
    for (paper, pitch_mm) in [(Paper::A4, 10.0), (Paper::A3, 20.0), (Paper::Letter, 10.0)] {
        let sheet = Sheet::new(paper, pitch_mm * 1e-3).unwrap();
        for (ending, bytes) in [("svg", svg(&sheet).into_bytes()), ("pdf", pdf(&sheet))] {
            let path = folder.join(format!("dot-target-{}.{ending}", paper.name()));
            if std::env::var_os("UPDATE").is_some() {
                std::fs::write(&path, &bytes).unwrap();
            }
            assert!(std::fs::read(&path).unwrap() == bytes, "{} differs from what is drawn; run the tests with UPDATE=1", path.display());
        }
    }
}

/// A bench as it may be: dark desk around the paper, a frame and a ruler printed or lying beside the dots, the shadow of an arm,
/// laser spots over paper and dots, noise. No invented dot, no wrong index, nothing far off.
#[test]
fn cluttered_benches() {
    for seed in 1..=SCENES {
        let mut state = seed.wrapping_mul(0x9E37_79B9_7F4A_7C15);
        let mut random = |low: f64, high: f64| {
            state ^= state << 13;
            state ^= state >> 7;
            state ^= state << 17;
            low + (high - low) * ((state >> 11) as f64 / (1_u64 << 53) as f64)
        };
        let (half_columns, half_rows) = (random(4.0, 14.0) as i32, random(3.0, 9.0) as i32);
        let size = [1500, 1100];
        let mut eye = Eye::square_on(
            size,
            (size[0] as f64 * random(0.6, 1.2) / f64::from(2 * half_columns + 3)).min(size[1] as f64 * 1.3 / f64::from(2 * half_rows + 3)),
        );
        (eye.slant_rad, eye.roll_rad, eye.k1) = (random(-0.75, 0.75), random(-3.1, 3.1), random(-0.25, 0.15));
        let dots = grid(-half_columns..=half_columns, -half_rows..=half_rows);
        let discs: Vec<PrintedDisc> = dots.iter().map(|d| d.1).collect();
        let desk = random(0.02, 0.5);
        let [wide, high] = [f64::from(half_columns) + 0.9, f64::from(half_rows) + 0.9];
        // Paper coordinates of a pixel, by Newton-free inversion: a coarse homography suffices for clutter.
        let pairs: Vec<_> = dots.iter().map(|(_, d)| (eye.project(d.at), d.at)).collect();
        let back = super::homography::homography(&pairs).unwrap();
        let on_paper = move |x: f64, y: f64| {
            let [u, v, w] = back.map(|r| r[0] * x + r[1] * y + r[2]);
            [u / w, v / w]
        };
        let shadow = random(-0.4, 0.9);
        let (shadow_turn, level) = (random(0.0, 3.1), random(0.15, 0.7));
        let paper = |x: f64, y: f64| {
            let [u, v] = on_paper(x, y);
            let along = (x / 1500.0 - 0.5) * shadow_turn.cos() + (y / 1100.0 - 0.5) * shadow_turn.sin();
            let mut light = level * (1.0 + 0.4 * along);
            if along > shadow && along < shadow + 0.12 {
                light *= 0.6;
            }
            if u.abs() > wide + 0.6 || v.abs() > high + 0.6 {
                light *= desk;
            }
            let frame = (u.abs() - wide).abs() < 0.04 && v.abs() < high + 0.04 || (v.abs() - high).abs() < 0.04 && u.abs() < wide + 0.04;
            let ruler = v > high + 0.2 && v < high + 0.5 && u.abs() < wide && (u * 5.0).fract().abs() < 0.2;
            if frame || ruler { light * 0.1 } else { light }
        };
        let spots: Vec<[f64; 4]> =
            (0..40).map(|_| [random(0.0, 1500.0), random(0.0, 1100.0), random(2.0, 9.0), random(0.02, 1.0) * random(0.0, 1.0)]).collect();
        let glow = |x: f64, y: f64| {
            spots
                .iter()
                .map(|[cx, cy, s, peak]| ((x - cx).powi(2) + (y - cy).powi(2), s, peak))
                .filter(|(r2, s, _)| *r2 < 30.0 * *s * *s)
                .map(|(r2, s, peak)| peak * (-0.5 * r2 / (s * s)).exp())
                .sum()
        };
        let light = paint(&Scene {
            size,
            discs: &discs,
            project: &|p| eye.project(p),
            ink: random(0.03, 0.3),
            blur_px: random(0.5, 2.0),
            paper: &paper,
            glow: &glow,
            noise: random(0.005, 0.06),
            seed,
        });
        let what = format!("seed {seed}: {half_columns} {half_rows} slant {:.2} roll {:.2} k1 {:.2}", eye.slant_rad, eye.roll_rad, eye.k1);
        let reading = read(&light, &ReadOptions::default()).unwrap_or_else(|error| panic!("{what}: {error}"));
        let truth: std::collections::HashMap<_, _> = dots.iter().map(|(index, d)| (*index, d)).collect();
        let mut pulls = 0.0;
        for dot in &reading.dots {
            let disc = truth.get(&dot.index).unwrap_or_else(|| panic!("{what}: invented dot {:?}", dot.index));
            let middle = rim_middle(&eye, disc);
            let off = (dot.at.x_px - middle[0]).hypot(dot.at.y_px - middle[1]);
            assert!(off < 1.0, "{what}: dot {:?} is off by {off} px", dot.index);
            pulls += off * off / (dot.covariance.xx + dot.covariance.yy);
        }
        let (found, complete) = (reading.dots.len(), count_complete(&eye, &dots));
        let pull = (pulls / found as f64).sqrt();
        println!("{what}: {found} of {complete}, pull {pull:.2}");
        // Spots and the shadow's edges lie on some; the rest must be there, with covariances of the right size.
        assert!(100 * found >= 65 * complete, "{what}: {found} of {complete}");
        assert!((0.4..1.4).contains(&pull), "{what}: pull {pull}");
    }
}

const SCENES: u64 = 4;
