//! Reads the targets of photos with known truth, where those are at hand.

use std::{collections::HashMap, path::PathBuf};

use super::{ReadOptions, Reading, read};
use crate::photo::{Light, Noise};

/// The folder with the photos, or `None` (and a printed line) where it is absent.
fn shared(what: &str) -> Option<PathBuf> {
    let root =
        std::env::var_os("SPOTRULE_SHARED").map_or_else(|| PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("../shared"), PathBuf::from);
    let path = root.join(what);
    if path.exists() {
        return Some(path);
    }
    println!("skipped: {} is not there", path.display());
    None
}

/// Luminance (`channel` = None) or one channel as linear light.
fn linear_light(path: &std::path::Path, channel: Option<usize>, orientation: u64, linear: bool) -> Light {
    let image = image::ImageReader::open(path).unwrap().with_guessed_format().unwrap().decode().unwrap();
    let image = match orientation {
        6 => image.rotate90(),
        8 => image.rotate270(),
        _ => image,
    };
    let curve = |v: u16| {
        let v = f32::from(v) / 65535.0;
        if linear {
            v
        } else if v <= 0.040_45 {
            v / 12.92
        } else {
            ((v + 0.055) / 1.055).powf(2.4)
        }
    };
    let table: Vec<f32> = (0..=u16::MAX).map(curve).collect();
    let rgb = image.to_rgb16();
    let value = rgb
        .pixels()
        .map(|p| {
            let [r, g, b] = p.0.map(|v| table[usize::from(v)]);
            channel.map_or(0.2126 * r + 0.7152 * g + 0.0722 * b, |c| [r, g, b][c])
        })
        .collect();
    let (width, height) = (rgb.width() as usize, rgb.height() as usize);
    Light { width, height, value, noise: Noise { a: 0.0, b: 0.0 } }
}

/// Centroid of a printed disc in the photo by averaging over many points of the disc.
struct Truth {
    dots: HashMap<(i32, i32), ([f64; 2], f64)>,
    size: [f64; 2],
    expected_inside: usize,
}

fn array<const N: usize>(v: &serde_json::Value) -> [f64; N] {
    std::array::from_fn(|n| v[n].as_f64().unwrap())
}

fn truth(case: &serde_json::Value, size: [f64; 2]) -> Truth {
    let camera = &case["camera"];
    let r: [[f64; 3]; 3] = std::array::from_fn(|n| array(&camera["R"][n]));
    let t: [f64; 3] = array(&camera["t_mm"]);
    let [k1, k2, p1, p2] = array(&camera["k1_k2_p1_p2"]);
    let [f, cx, cy] = ["f_px", "cx", "cy"].map(|k| camera[k].as_f64().unwrap());
    let throw = case["bench"]["throw_mm"].as_f64().unwrap();
    let tilt = ["x", "y"].map(|k| case["bench"]["tilt_deg"][k].as_f64().unwrap().to_radians());
    let target = &case["target"];
    let pitch = target["pitch_mm"].as_f64().unwrap();
    let zero: [f64; 2] = array(&target["zero_order_on_target_mm"]);
    let turn = target["rotation_deg"].as_f64().unwrap().to_radians();
    let behind = case["view"] == "behind";
    let pixel = |x: f64, y: f64| {
        let (dx, dy) = (x - zero[0], y - zero[1]);
        let (right, up) = (turn.cos() * dx - turn.sin() * dy, turn.sin() * dx + turn.cos() * dy);
        let (bx, by) = (if behind { right } else { -right }, up);
        // R = Ry Rx on (x, y, 0).
        let (x1, y1, z1) = (bx, by * tilt[0].cos(), by * tilt[0].sin());
        let bench = [x1 * tilt[1].cos() + z1 * tilt[1].sin(), y1, throw - x1 * tilt[1].sin() + z1 * tilt[1].cos()];
        let c: [f64; 3] = std::array::from_fn(|n| r[n][0] * bench[0] + r[n][1] * bench[1] + r[n][2] * bench[2] + t[n]);
        let (x, y) = (c[0] / c[2], c[1] / c[2]);
        let r2 = x * x + y * y;
        let radial = 1.0 + r2 * (k1 + k2 * r2);
        let xd = x * radial + 2.0 * p1 * x * y + p2 * (r2 + 2.0 * x * x);
        let yd = y * radial + p1 * (r2 + 2.0 * y * y) + 2.0 * p2 * x * y;
        [f * xd + cx, f * yd + cy]
    };
    let mut dots = HashMap::new();
    let mut expected_inside = 0;
    for dot in target["dots"].as_array().unwrap() {
        let (i, j) = ["i", "j"].map(|k| i32::try_from(dot[k].as_i64().unwrap()).unwrap()).into();
        let radius = dot["d_mm"].as_f64().unwrap() / 2.0;
        let stated: [f64; 2] = array(&dot["px"]);
        let centre = pixel(f64::from(i) * pitch, f64::from(j) * pitch);
        assert!((centre[0] - stated[0]).hypot(centre[1] - stated[1]) < 2e-3, "frames differ: {centre:?} {stated:?}");
        // Green's theorem on the image of the rim: area and first moments.
        let rim: Vec<[f64; 2]> = (0..256)
            .map(|n| f64::from(n) / 256.0 * std::f64::consts::TAU)
            .map(|a| pixel(f64::from(i) * pitch + radius * a.cos(), f64::from(j) * pitch + radius * a.sin()))
            .collect();
        let (mut area, mut mx, mut my) = (0.0, 0.0, 0.0);
        for n in 0..rim.len() {
            let (p, q) = (rim[n], rim[(n + 1) % rim.len()]);
            let (p, q) = ([p[0] - centre[0], p[1] - centre[1]], [q[0] - centre[0], q[1] - centre[1]]);
            let cross = p[0] * q[1] - p[1] * q[0];
            area += cross / 2.0;
            mx += cross * (p[0] + q[0]) / 6.0;
            my += cross * (p[1] + q[1]) / 6.0;
        }
        let margin = 8.0;
        let inside = rim.iter().all(|p| p[0] > margin && p[1] > margin && p[0] < size[0] - 1.0 - margin && p[1] < size[1] - 1.0 - margin);
        expected_inside += usize::from(inside);
        dots.insert((i, j), ([centre[0] + mx / area, centre[1] + my / area], radius / pitch));
    }
    Truth { dots, size, expected_inside }
}

/// Figures of one photo.
struct Score {
    found: usize,
    wrong: usize,
    rms_px: f64,
    mean_u_px: f64,
    pull_rms: f64,
    worst_pull: f64,
}

fn score(reading: &Reading, truth: &Truth) -> Score {
    let (mut wrong, mut square, mut pulls, mut u2, mut n, mut worst_pull) = (0, 0.0, 0.0, 0.0, 0.0, 0.0_f64);
    for dot in &reading.dots {
        let Some((at, _)) = truth.dots.get(&dot.index) else {
            wrong += 1;
            continue;
        };
        let (dx, dy) = (dot.at.x_px - at[0], dot.at.y_px - at[1]);
        if dx.hypot(dy) > 3.0 {
            wrong += 1;
            continue;
        }
        square += dx * dx + dy * dy;
        let (px, py) = (dx / dot.covariance.xx.sqrt(), dy / dot.covariance.yy.sqrt());
        pulls += px * px + py * py;
        worst_pull = worst_pull.max(px.abs()).max(py.abs());
        u2 += dot.covariance.xx + dot.covariance.yy;
        n += 2.0;
    }
    Score {
        found: reading.dots.len(),
        wrong,
        rms_px: (square / n).sqrt(),
        mean_u_px: (u2 / n).sqrt(),
        pull_rms: (pulls / n).sqrt(),
        worst_pull,
    }
}

fn cases() -> Vec<(String, PathBuf)> {
    let Some(folder) = shared("corpus/cases") else { return Vec::new() };
    let mut names: Vec<_> = std::fs::read_dir(folder).unwrap().map(|entry| entry.unwrap().path()).collect();
    names.sort();
    names.into_iter().map(|path| (path.file_name().unwrap().to_string_lossy().into_owned(), path)).collect()
}

fn json(path: &std::path::Path) -> serde_json::Value {
    serde_json::from_str(&std::fs::read_to_string(path).unwrap()).unwrap()
}

/// Every target photo is read, no dot gets a wrong index, and the centroids scatter as their covariance says.
#[test]
fn targets_of_known_truth() {
    let mut failures = Vec::new();
    for (name, path) in cases() {
        let (given, case) = (json(&path.join("given.json")), json(&path.join("truth.json")));
        let Some(photo) = given["photos"].as_array().unwrap().iter().find(|p| p["role"] == "target") else { continue };
        let file = photo["file"].as_str().unwrap();
        let stated = case["photos"].as_array().unwrap().iter().find(|p| p["file"] == file).unwrap();
        let orientation = stated["format"]["orientation"].as_u64().unwrap_or(1);
        let light = linear_light(&path.join(file), None, orientation, !file.ends_with("jpg"));
        let truth = truth(&case, [light.width as f64, light.height as f64]);
        let start = std::time::Instant::now();
        let reading = match read(&light, &ReadOptions::default()) {
            Ok(reading) => reading,
            Err(error) => {
                failures.push(format!("{name}: {error}"));
                continue;
            }
        };
        let took_ms = start.elapsed().as_secs_f64() * 1e3;
        let s = score(&reading, &truth);
        println!(
            "{name} {}x{} {:4} of {:4} wrong {} rms {:.4} u {:.4} pull {:.2} worst {:.1} radii {:.4} {:.4} {took_ms:.0} ms",
            truth.size[0],
            truth.size[1],
            s.found,
            truth.expected_inside,
            s.wrong,
            s.rms_px,
            s.mean_u_px,
            s.pull_rms,
            s.worst_pull,
            reading.dot_radius_pitches,
            reading.mark_radius_pitches
        );
        // Found with this reader: 0.006 to 0.020 px, pulls 0.90 to 1.08 (see the printed lines).
        if s.wrong > 0 || s.found * 100 < truth.expected_inside * 95 || s.rms_px > 0.03 || !(0.8..1.25).contains(&s.pull_rms) {
            failures.push(format!("{name}: wrong {}, found {} of {}, pull {}", s.wrong, s.found, truth.expected_inside, s.pull_rms));
        }
    }
    assert!(failures.is_empty(), "{}", failures.join("\n"));
}

/// Dots in the pattern photo itself: the plane with the least laser light gives most of them, laser light
/// over a dot does not go unnoticed, and even plain luminance gives no wrong index.
#[test]
fn targets_under_laser_spots() {
    let mut failures = Vec::new();
    for (name, path) in cases().into_iter().filter(|(name, _)| name.starts_with('U')) {
        let case = json(&path.join("truth.json"));
        for channel in [None, Some(0), Some(1), Some(2)] {
            let light = linear_light(&path.join("pattern.jpg"), channel, 1, false);
            let truth = truth(&case, [light.width as f64, light.height as f64]);
            let reading = match read(&light, &ReadOptions::default()) {
                Ok(reading) => reading,
                // In the laser's own channel its light covers the marks.
                Err(super::TargetError::MarksNotFound { larger, .. }) if channel == Some(0) => {
                    println!("{name} channel {channel:?}: {larger} marks");
                    continue;
                }
                Err(error) => {
                    failures.push(format!("{name} channel {channel:?}: {error}"));
                    continue;
                }
            };
            let s = score(&reading, &truth);
            println!(
                "{name} channel {channel:?} {:4} of {:4} wrong {} rms {:.4} u {:.4} pull {:.2} worst {:.1} radii {:.4} {:.4}",
                s.found,
                truth.expected_inside,
                s.wrong,
                s.rms_px,
                s.mean_u_px,
                s.pull_rms,
                s.worst_pull,
                reading.dot_radius_pitches,
                reading.mark_radius_pitches
            );
            if s.wrong > 0 || s.found * 100 < truth.expected_inside * 80 || !(0.3..1.5).contains(&s.pull_rms) {
                failures.push(format!("{name} {channel:?}: wrong {}, found {}, pull {}", s.wrong, s.found, s.pull_rms));
            }
        }
    }
    assert!(failures.is_empty(), "{}", failures.join("\n"));
}

/// Real lenses and imperfect dots, no marks: nearly all dots are taken in, and the spacing in the middle of the photo is the one
/// measured by hand with another script (nearest neighbours, to about 0.2 %).
#[test]
fn sheets_from_real_cameras() {
    let options = ReadOptions { marks: super::Marks::Absent, ..ReadOptions::default() };
    for (file, least, spacing_px) in [
        ("dot-sheet-01.jpg", 6000, Some(26.78)),
        ("dot-sheet-02.jpg", 1200, Some(62.6)),
        ("dot-sheet-03.jpg", 4500, Some(45.15)),
        ("dot-sheet-fisheye.jpg", 1200, None),
    ] {
        let Some(path) = shared(&format!("photos/{file}")) else { continue };
        let light = linear_light(&path, None, 1, false);
        let reading = read(&light, &options).unwrap();
        let mut u: Vec<f64> = reading.dots.iter().map(|dot| dot.covariance.xx.sqrt()).collect();
        let at: HashMap<_, _> = reading.dots.iter().map(|dot| (dot.index, dot.at)).collect();
        let central = |i: &(i32, i32)| i.0.abs() < 8 && i.1.abs() < 8;
        let mut steps: Vec<f64> = at
            .iter()
            .filter(|(index, _)| central(index))
            .filter_map(|(index, here)| Some(here.distance_px(*at.get(&(index.0 + 1, index.1))?)))
            .collect();
        let step = super::median(&mut steps).unwrap();
        println!("{file}: {} dots, u {:.3} px, spacing {step:.2} px", reading.dots.len(), super::median(&mut u).unwrap());
        assert!(reading.dots.len() >= least, "{file}: {} dots", reading.dots.len());
        if let Some(want) = spacing_px {
            assert!((step / want - 1.0).abs() < 0.005, "{file}: spacing {step}, by hand {want}");
        }
        // No wrong index: every neighbour lies where a step takes it.
        for (index, here) in &at {
            if let Some(next) = at.get(&(index.0 + 1, index.1)) {
                assert!((0.4..1.6).contains(&(here.distance_px(*next) / step)), "{file}: {index:?}");
            }
        }
    }
}
