//! Indexing against photos with known truth: their orders and junk as plain points, seen through a rough geometry.
//! Needs the folder of cases (environment variable `SPOTRULE_SHARED` or `../shared`); skipped where it is absent.

use std::path::PathBuf;

use serde_json::Value;

use super::*;

/// How wrong the geometry is on purpose.
#[derive(Clone, Copy)]
struct Wrong {
    throw: f64,
    tilt_deg: f64,
    bend: f64,
}

struct Case {
    points: Vec<Point>,
    truth: Vec<Option<(i32, i32)>>,
    line: bool,
    frame: Frame,
}

/// The rough geometry: screen millimetres to direction cosines along the sample, and back to pixels.
#[derive(Clone)]
struct Frame {
    throw: f64,
    screen: [[f64; 3]; 3],
    sample: [[f64; 3]; 3],
    camera: [[f64; 3]; 3],
    camera_t: [f64; 3],
    f: f64,
    centre: [f64; 2],
    size: [f64; 2],
}

fn turn(x_deg: f64, y_deg: f64) -> [[f64; 3]; 3] {
    let ((sx, cx), (sy, cy)) = (x_deg.to_radians().sin_cos(), y_deg.to_radians().sin_cos());
    [[cy, sy * sx, sy * cx], [0.0, cx, -sx], [-sy, cy * sx, cy * cx]]
}

fn column(m: &[[f64; 3]; 3], j: usize) -> [f64; 3] {
    [m[0][j], m[1][j], m[2][j]]
}

fn dot3(a: [f64; 3], b: [f64; 3]) -> f64 {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}

impl Frame {
    fn cosines(&self, x: f64, y: f64) -> [f64; 2] {
        let (ex, ey) = (column(&self.screen, 0), column(&self.screen, 1));
        let p = [x * ex[0] + y * ey[0], x * ex[1] + y * ey[1], self.throw + x * ex[2] + y * ey[2]];
        let r = dot3(p, p).sqrt();
        [dot3(p, column(&self.sample, 0)) / r, dot3(p, column(&self.sample, 1)) / r]
    }

    fn screen_from_pixel(&self, px: [f64; 2]) -> [f64; 2] {
        let d = [(px[0] - self.centre[0]) / self.f, (px[1] - self.centre[1]) / self.f, 1.0];
        let ray = [dot3(column(&self.camera, 0), d), dot3(column(&self.camera, 1), d), dot3(column(&self.camera, 2), d)];
        let t = self.camera_t;
        let eye = [0, 1, 2].map(|j| -dot3(column(&self.camera, j), t));
        let n = column(&self.screen, 2);
        let to_plane = dot3([-eye[0], -eye[1], self.throw - eye[2]], n) / dot3(ray, n);
        let p = [0, 1, 2].map(|j| eye[j] + to_plane * ray[j] - if j == 2 { self.throw } else { 0.0 });
        [dot3(p, column(&self.screen, 0)), dot3(p, column(&self.screen, 1))]
    }

    fn visible(&self, at: [f64; 2]) -> bool {
        let rest = 1.0 - at[0] * at[0] - at[1] * at[1];
        if rest <= 0.0 {
            return false;
        }
        let u = [0, 1, 2].map(|j| at[0] * self.sample[j][0] + at[1] * self.sample[j][1] + rest.sqrt() * self.sample[j][2]);
        let n = column(&self.screen, 2);
        let reach = self.throw * n[2] / dot3(u, n);
        if reach <= 0.0 {
            return false;
        }
        let p = u.map(|c| c * reach);
        let c = [0, 1, 2].map(|j| dot3(self.camera[j], p) + self.camera_t[j]);
        let px = [self.f * c[0] / c[2] + self.centre[0], self.f * c[1] / c[2] + self.centre[1]];
        c[2] > 0.0 && px[0] > 0.0 && px[1] > 0.0 && px[0] < self.size[0] && px[1] < self.size[1]
    }
}

fn number(v: &Value) -> f64 {
    v.as_f64().unwrap()
}

fn vector(v: &Value) -> Vec<f64> {
    v.as_array().unwrap().iter().map(number).collect()
}

fn frame(truth: &Value, photo: &Value, sample: &Value, wrong: Wrong) -> Frame {
    let camera = &truth["camera"];
    let rows: Vec<Vec<f64>> = camera["R"].as_array().unwrap().iter().map(vector).collect();
    let t = vector(&camera["t_mm"]);
    let c = camera;
    let moved = photo["camera_moved_along_z_mm"].as_f64().unwrap_or(0.0);
    let camera_rows = [0, 1, 2].map(|i| [rows[i][0], rows[i][1], rows[i][2]]);
    Frame {
        throw: number(&photo["throw_mm"]) * wrong.throw,
        screen: turn(number(&truth["bench"]["tilt_deg"]["x"]) + wrong.tilt_deg, number(&truth["bench"]["tilt_deg"]["y"])),
        sample: turn(number(&sample["incidence_deg"]["x"]), number(&sample["incidence_deg"]["y"]) + wrong.tilt_deg),
        camera: camera_rows,
        camera_t: [0, 1, 2].map(|i| t[i] - camera_rows[i][2] * moved),
        f: number(&c["f_px"]),
        centre: [number(&c["cx"]), number(&c["cy"])],
        size: [number(&photo["size"][0]), number(&photo["size"][1])],
    }
}

fn load(truth: &Value, photo: &Value, wrong: Wrong) -> Case {
    let sample = &truth["samples"][usize::try_from(photo["sample"].as_u64().unwrap_or(0)).unwrap()];
    let frame = frame(truth, photo, sample, wrong);
    // A tenth of a millimetre on the screen.
    let u = 0.1 / frame.throw;
    let (mut points, mut orders) = (Vec::new(), Vec::new());
    for o in photo["orders"].as_array().unwrap() {
        if number(&o["snr"]) > 5.0 {
            points.push(Point::new(frame.cosines(number(&o["x_mm"]), number(&o["y_mm"])), u, number(&o["peak"])));
            let whole = |key: &str| i32::try_from(o[key].as_i64().unwrap_or(0)).unwrap();
            orders.push(Some((whole("h"), whole("k"))));
        }
    }
    for kind in ["ghosts", "blobs", "glints"] {
        for junk in photo[kind].as_array().into_iter().flatten() {
            let px = vector(&junk["px"]);
            let [x, y] = frame.screen_from_pixel([px[0], px[1]]);
            points.push(Point::new(frame.cosines(x, y), u, number(&junk["peak"])));
            orders.push(None);
        }
    }
    Case { points, truth: orders, line: sample["kind"] == "line", frame }
}

/// What is wrong with a numbering against the truth, if anything.
fn fault(case: &Case, found: &Indexed) -> Option<String> {
    if case.line != (found.shape == Shape::Line) {
        return Some(format!("shape {:?}", found.shape));
    }
    let pairs: Vec<((i32, i32), (i32, i32))> = case.truth.iter().zip(&found.order).filter_map(|(t, f)| Some(((*t)?, (*f)?))).collect();
    let range = -6..=6;
    let maps = range.clone().flat_map(|a| {
        let range = -6..=6;
        range.flat_map(move |b| (-6..=6).flat_map(move |c| (-6..=6).map(move |d| (a, b, c, d))))
    });
    let fits = |&(a, b, c, d): &(i32, i32, i32, i32)| {
        (a * d - b * c).abs() == 1 && pairs.iter().all(|((h, k), f)| (a * h + b * k, c * h + d * k) == *f)
    };
    if maps.clone().find(fits).is_none() {
        let first: Vec<_> = pairs.iter().take(6).collect();
        return Some(format!("numbering: {first:?}, g {:?}", found.g));
    }
    let orders = case.truth.iter().flatten().count();
    let lost = orders - pairs.len();
    // One in a thousand true points is lost at the acceptance gate; distortion far out may cost a few more.
    (lost > orders / 20 + 1).then(|| format!("{lost} of {orders} orders lost"))
}

#[test]
fn every_class_of_the_known_photos_is_numbered_as_in_truth() {
    known_photos(Wrong { throw: 1.01, tilt_deg: 1.0, bend: 0.1 });
}

/// As rough as a photo without a target: throw wrong by 15 %, screen and sample each by 4 degrees.
#[test]
fn a_very_rough_geometry_is_enough() {
    known_photos(Wrong { throw: 1.15, tilt_deg: 4.0, bend: 0.15 });
}

fn known_photos(wrong: Wrong) {
    let shared = std::env::var_os("SPOTRULE_SHARED").map_or_else(|| PathBuf::from("../shared"), PathBuf::from);
    let Ok(cases) = std::fs::read_dir(shared.join("corpus/cases")) else {
        println!("skipped: no folder of known photos");
        return;
    };
    let mut folders: Vec<PathBuf> = cases.map(|c| c.unwrap().path()).collect();
    folders.sort();
    let (mut faults, mut photos) = (Vec::new(), 0);
    for folder in folders {
        let truth: Value = serde_json::from_str(&std::fs::read_to_string(folder.join("truth.json")).unwrap()).unwrap();
        for photo in truth["photos"].as_array().unwrap() {
            if photo["role"] == "target" || !photo["orders"].is_array() {
                continue;
            }
            photos += 1;
            let name = format!("{} {}", truth["case"].as_str().unwrap(), photo["file"].as_str().unwrap());
            let case = load(&truth, photo, wrong);
            let refusable = case.truth.iter().flatten().count() < 3;
            let visible = |at: [f64; 2]| case.frame.visible(at);
            match index(&case.points, &IndexOptions { bend: wrong.bend, ..IndexOptions::default() }, &visible) {
                Ok(found) if refusable => faults.push(format!("{name}: accepted with {:?}", found.evidence)),
                Ok(found) => {
                    let stray = case.truth.iter().zip(&found.order).filter(|(t, f)| t.is_none() && f.is_some()).count();
                    println!(
                        "{name}: {} of {} points, {} of {} nodes, junk taken {stray}, evidence {:.0}, zero lead {:.1}, rms {:.4}, {:?}",
                        found.evidence.explained,
                        case.points.len(),
                        found.evidence.explained,
                        found.evidence.predicted_visible,
                        found.evidence.log_evidence,
                        found.evidence.zero_lead,
                        found.evidence.rms_orders,
                        found.warnings
                    );
                    faults.extend(fault(&case, &found).map(|f| format!("{name}: {f}")));
                }
                Err(error) if refusable => println!("{name}: refused: {error}"),
                Err(error) => faults.push(format!("{name}: {error}")),
            }
        }
    }
    assert!(faults.is_empty(), "{} of {photos} photos at fault:\n{}", faults.len(), faults.join("\n"));
}
