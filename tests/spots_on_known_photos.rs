//! Spots found on rendered photos with known truth, where that collection is at hand (`SPOTRULE_SHARED` or `../shared`).

#![expect(clippy::unwrap_used, clippy::print_stdout, reason = "a test that reports its figures")]

use std::path::{Path, PathBuf};

use serde_json::Value;
use spotrule::{photo, spots};

fn collection() -> Option<PathBuf> {
    let shared = std::env::var_os("SPOTRULE_SHARED").map_or_else(|| PathBuf::from("../shared"), PathBuf::from);
    let cases = shared.join("corpus/cases");
    cases.is_dir().then_some(cases)
}

#[derive(Default, Clone)]
struct Score {
    wanted: [usize; 2],
    seen: [usize; 2],
    false_spots: usize,
    photos: usize,
    /// Per kind (0 unclipped, 1 clipped): error², floor², pull² and their number (two axes each).
    error2: [f64; 2],
    /// Squared pulls and their number for signal-to-noise ratios 8..16, 16..40 and above, unclipped.
    by_strength: [(f64, f64); 3],
    floor2: [f64; 2],
    pull2: [f64; 2],
    beyond3: [usize; 2],
    number: [usize; 2],
}

fn number(value: &Value) -> f64 {
    value.as_f64().unwrap_or(f64::NAN)
}

fn places(photo: &Value, list: &str) -> Vec<([f64; 2], f64)> {
    let entries = photo[list].as_array().cloned().unwrap_or_default();
    entries.iter().map(|e| ([number(&e["px"][0]), number(&e["px"][1])], number(&e["sigma_px"][0]).max(number(&e["sigma_px"][1])))).collect()
}

fn score_photo(case: &Path, truth: &Value, photo: &Value, score: &mut Score) {
    let file = photo["file"].as_str().unwrap();
    let decoded = photo::decode(&std::fs::read(case.join(file)).unwrap()).unwrap();
    let Ok(found) = spots::find(&decoded, &spots::SpotOptions::default()) else { return };
    score.photos += 1;
    let floor = 0.3 * number(&truth["look"]["speckle"]) * number(&truth["look"]["grain"]);
    let mut is_known = vec![false; found.spots.len()];
    for list in ["orders", "ghosts", "blobs", "glints"] {
        for ([x, y], sigma) in places(photo, list) {
            for (spot, known) in found.spots.iter().zip(&mut is_known) {
                *known |= (spot.at.x_px - x).hypot(spot.at.y_px - y) < (2.0 * sigma).max(4.0);
            }
        }
    }
    score.false_spots += is_known.iter().filter(|known| !**known).count();
    for order in photo["orders"].as_array().unwrap().iter().filter(|order| number(&order["snr"]) >= 8.0) {
        score_order(order, floor, &found.spots, score);
    }
}

fn score_order(order: &Value, floor: f64, spots: &[spots::Spot], score: &mut Score) {
    let (x, y) = (number(&order["px"][0]), number(&order["px"][1]));
    let (snr, sigma) = (number(&order["snr"]), number(&order["sigma_px"][0]).max(number(&order["sigma_px"][1])));
    let kind = usize::from(order["saturated"].as_bool().unwrap());
    score.wanted[kind] += 1;
    let distance = |spot: &&spots::Spot| (spot.at.x_px - x).hypot(spot.at.y_px - y);
    let nearest = spots.iter().min_by(|a, b| distance(a).total_cmp(&distance(b)));
    let Some(spot) = nearest.filter(|spot| distance(spot) < (1.5 * sigma).max(2.0)) else { return };
    let (dx, dy, c) = (spot.at.x_px - x, spot.at.y_px - y, spot.covariance);
    let pull2 = (c.yy * dx * dx - 2.0 * c.xy * dx * dy + c.xx * dy * dy) / (c.xx * c.yy - c.xy * c.xy);
    score.seen[kind] += 1;
    score.error2[kind] += dx * dx + dy * dy;
    score.floor2[kind] += 2.0 * floor * floor;
    score.pull2[kind] += pull2;
    // Beyond three standard deviations in two dimensions: chi-square above 11.83.
    score.beyond3[kind] += usize::from(pull2 > 11.83);
    score.number[kind] += 2;
    if kind == 0 {
        let class = usize::from(snr > 16.0) + usize::from(snr > 40.0);
        score.by_strength[class].0 += pull2;
        score.by_strength[class].1 += 2.0;
    }
}

impl Score {
    fn add(&mut self, other: &Self) {
        self.false_spots += other.false_spots;
        self.photos += other.photos;
        for (sum, more) in self.by_strength.iter_mut().zip(other.by_strength) {
            sum.0 += more.0;
            sum.1 += more.1;
        }
        for kind in 0..2 {
            self.wanted[kind] += other.wanted[kind];
            self.seen[kind] += other.seen[kind];
            self.error2[kind] += other.error2[kind];
            self.floor2[kind] += other.floor2[kind];
            self.pull2[kind] += other.pull2[kind];
            self.beyond3[kind] += other.beyond3[kind];
            self.number[kind] += other.number[kind];
        }
    }

    fn print(&self, name: &str) {
        let rms = |sum: f64, kind: usize| (sum / self.number[kind].max(1) as f64).sqrt();
        println!(
            "{name:6} open {:4}/{:4} error {:.3} px (speckle floor {:.3}) pull {:.2} ({}) beyond {:2} | clipped {:3}/{:3} error {:.3} px pull {:.2} beyond {:2} | false {:5.1} per photo",
            self.seen[0],
            self.wanted[0],
            rms(self.error2[0], 0),
            rms(self.floor2[0], 0),
            rms(self.pull2[0], 0),
            self.by_strength.map(|(sum, n)| format!("{:.2}", (sum / n.max(1.0)).sqrt())).join(" "),
            self.beyond3[0],
            self.seen[1],
            self.wanted[1],
            rms(self.error2[1], 1),
            rms(self.pull2[1], 1),
            self.beyond3[1],
            self.false_spots as f64 / self.photos.max(1) as f64
        );
    }
}

#[test]
fn spots_lie_where_they_were_rendered() {
    let Some(cases) = collection() else {
        println!("skipped: no photos with known truth at hand");
        return;
    };
    let only = std::env::var("SPOTS_ONLY").unwrap_or_default();
    let mut names: Vec<PathBuf> = std::fs::read_dir(cases).unwrap().map(|entry| entry.unwrap().path()).collect();
    names.sort();
    let mut all = Score::default();
    for case in names {
        let name = case.file_name().unwrap().to_string_lossy().into_owned();
        if name.starts_with('S') || !name.starts_with(&only) {
            continue;
        }
        let truth: Value = serde_json::from_slice(&std::fs::read(case.join("truth.json")).unwrap()).unwrap();
        let mut score = Score::default();
        for photo in truth["photos"].as_array().unwrap().iter().filter(|photo| photo["role"] == "pattern") {
            score_photo(&case, &truth, photo, &mut score);
        }
        score.print(&name);
        all.add(&score);
    }
    all.print("all");
    let share = |kind: usize| all.seen[kind] as f64 / all.wanted[kind] as f64;
    assert!(share(0) > 0.97 && share(1) > 0.95, "spots missed: {} and {}", share(0), share(1));
    let pull = |kind: usize| (all.pull2[kind] / all.number[kind] as f64).sqrt();
    // Honest uncertainties give 1; the tails of speckle and of clipped cores lift it.
    assert!((0.8..1.3).contains(&pull(0)) && (0.8..1.4).contains(&pull(1)), "pulls {} and {}", pull(0), pull(1));
    assert!(all.false_spots < 10 * all.photos, "{} false spots in {} photos", all.false_spots, all.photos);
}

#[test]
fn bad_input_is_refused_in_words() {
    let Some(cases) = collection() else {
        println!("skipped: no photos with known truth at hand");
        return;
    };
    for (case, words) in [("S-0005", "cut off"), ("S-0006", "a text"), ("S-0007", "at least 32 px")] {
        let error = photo::decode(&std::fs::read(cases.join(case).join("pattern.jpg")).unwrap()).unwrap_err().to_string();
        assert!(error.contains(words), "{case}: {error}");
    }
    for case in ["S-0001", "S-0002", "S-0003", "S-0004"] {
        let photo = photo::decode(&std::fs::read(cases.join(case).join("pattern.jpg")).unwrap()).unwrap();
        match spots::find(&photo, &spots::SpotOptions::default()) {
            Ok(found) => println!("{case}: {} spots", found.spots.len()),
            Err(error) => println!("{case}: {error}"),
        }
    }
}
