//! A planted truth comes back, and as often inside the stated uncertainty as stated.

use super::scenes::{drawn, measured, small, truth};

/// Seeds per scene; each draws everything that the operator states anew around its stated uncertainty, and all noise.
const SEEDS: std::ops::Range<u64> = 100..106;

/// Every |found − true| / u stays below 4.5 (one honest value in 150 000 would not), and together they are neither too small (uncertainty
/// overstated) nor too large: with 36 benches, whose pitches move together, the root mean square of honest values lies within 0.6 to 1.5.
#[test]
fn planted_pitches_come_back_within_their_uncertainty() {
    let mut pulls = Vec::new();
    for name in ["embossed-film", "ruled-grating", "shelf-label-panel", "filter-mesh"] {
        for seed in SEEDS {
            let scene = small(name, 0.5).redrawn(seed);
            let found = measured(&scene, &drawn(&scene), &scene.bench()).unwrap_or_else(|refusal| panic!("{name}, seed {seed}: {refusal}"));
            let (pitches, angle) = truth(&scene);
            assert_eq!(found.sample.pitch_m.len(), pitches.len(), "{name}, seed {seed}");
            let mut values: Vec<(f64, f64, f64)> = found.sample.pitch_m.iter().zip(&pitches).map(|(p, &t)| (p.value, p.u, t)).collect();
            values.extend(found.sample.lattice_angle_rad.zip(angle).map(|(a, t)| (a.value, a.u, t)));
            for (value, u, true_value) in values {
                let pull = (value - true_value) / u;
                assert!(pull.abs() < 4.5, "{name}, seed {seed}: found {value:e}, true {true_value:e}, u {u:e}, pull {pull:.2}");
                pulls.push(pull);
            }
            let share: f64 = found.sample.budget.iter().map(|line| line.share[0]).sum();
            assert!((share - 1.0).abs() < 1e-9, "the shares of the budget add up to {share}");
        }
    }
    let rms = (pulls.iter().map(|pull| pull * pull).sum::<f64>() / pulls.len() as f64).sqrt();
    println!("{} values, rms pull {rms:.2}", pulls.len());
    assert!((0.6..1.5).contains(&rms), "rms pull {rms:.2} over {} values", pulls.len());
}

/// Wide orders are their own ruler: neither throw nor scale is known, only the laser, and that the camera stood square-on.
#[test]
fn a_fine_pitch_is_found_with_nothing_known_but_the_laser() {
    for seed in SEEDS.take(3) {
        let scene = small("no-target", 0.6).redrawn(seed);
        let found = measured(&scene, &drawn(&scene), &scene.bench()).unwrap_or_else(|refusal| panic!("seed {seed}: {refusal}"));
        let (pitches, _) = truth(&scene);
        for (pitch, true_value) in found.sample.pitch_m.iter().zip(pitches) {
            let pull = (pitch.value - true_value) / pitch.u;
            assert!(pull.abs() < 4.5 && pitch.u < 0.02 * pitch.value, "seed {seed}: {pitch:?}, true {true_value:e}, pull {pull:.2}");
        }
    }
}
