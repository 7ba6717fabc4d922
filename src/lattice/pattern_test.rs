//! Made patterns: noise, missing orders, junk, ghosts, distortion, absent zero order, rows of few spots, chance.

use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};

use super::*;

/// What a made pattern looks like.
#[derive(Debug, Clone, Copy)]
struct Recipe {
    line: bool,
    /// Junk points per true point.
    junk: f64,
    /// A displaced copy of the pattern, as bright as this share of it.
    ghost: f64,
    /// The zero order falls into a hole.
    hidden_zero: bool,
    /// Even orders along h are absent (h = 0 stays).
    odd_only: bool,
    /// Relative change of local scale at the edge of the window.
    distortion: f64,
}

const PLAIN: Recipe = Recipe { line: false, junk: 0.0, ghost: 0.0, hidden_zero: false, odd_only: false, distortion: 0.03 };

struct Made {
    points: Vec<Point>,
    truth: Vec<Option<(i32, i32)>>,
    window: [f64; 4],
}

impl Made {
    fn sees(&self, at: [f64; 2]) -> bool {
        let [x0, x1, y0, y1] = self.window;
        (x0..x1).contains(&at[0]) && (y0..y1).contains(&at[1])
    }

    fn index(&self) -> Result<Indexed, LatticeError> {
        index(&self.points, &IndexOptions::default(), &|at| self.sees(at))
    }
}

fn sinc2(x: f64) -> f64 {
    let t = std::f64::consts::PI * x;
    if t.abs() < 1e-9 { 1.0 } else { (t.sin() / t).powi(2) }
}

fn normal(random: &mut ChaCha8Rng) -> f64 {
    StandardNormal.sample(random)
}

/// A pattern by the recipe: cell of any kind, openings of a third to two thirds of the pitch, orders down to a faint limit.
fn make(recipe: &Recipe, seed: u64) -> Made {
    let random = &mut ChaCha8Rng::seed_from_u64(seed);
    let step = 0.012 * 10.0_f64.powf(random.random_range(0.0..1.0));
    let turn = random.random_range(0.0..std::f64::consts::TAU);
    let angle = [90.0, 60.0, random.random_range(62.0..118.0)][random.random_range(0..3)] * std::f64::consts::PI / 180.0;
    let ratio = if random.random_bool(0.5) { 1.0 } else { random.random_range(1.0..1.8) };
    let g = [[step * turn.cos(), step * turn.sin()], [step * ratio * (turn + angle).cos(), step * ratio * (turn + angle).sin()]];
    let (cx, cy) = (random.random_range(-0.06..0.06), random.random_range(-0.05..0.05));
    let window = [cx - 0.27, cx + 0.27, cy - 0.2, cy + 0.2];
    let open = if recipe.odd_only {
        [0.5, random.random_range(0.3..0.6)]
    } else {
        [random.random_range(0.25..0.45), random.random_range(0.25..0.45)]
    };
    let faintest = 10.0_f64.powf(random.random_range(-3.5..-2.0));
    let zero_factor = 10.0_f64.powf(random.random_range(0.5..3.0));
    let u = step * random.random_range(0.001..0.008);
    let bend: Vec<f64> = (0..6).map(|_| recipe.distortion / 0.3 * random.random_range(-0.5..0.5)).collect();
    let affine: Vec<f64> = (0..4).map(|_| random.random_range(-0.03..0.03)).collect();
    let offset = [random.random_range(-0.05..0.05), random.random_range(-0.05..0.05)];
    let warp = |p: [f64; 2]| {
        let [x, y] = [p[0] * (1.0 + affine[0]) + affine[1] * p[1], p[1] * (1.0 + affine[2]) + affine[3] * p[0]];
        let down = 1.0 + bend[0] * x + bend[1] * y;
        let radial = 1.0 + bend[2] * (x * x + y * y) / 0.3;
        [x * radial / down, y * radial / down]
    };
    let mut made = Made { points: Vec::new(), truth: Vec::new(), window };
    let shift = [step * random.random_range(0.2..0.8), step * random.random_range(0.2..0.8)];
    let mut ghosts = Vec::new();
    let reach = if recipe.line { 0 } else { 40 };
    for h in -40..=40 {
        for k in -reach..=reach {
            let flat = [0, 1].map(|i| f64::from(h) * g[0][i] + f64::from(k) * g[1][i]);
            if flat[0].hypot(flat[1]) > 0.45 {
                continue; // The made distortion folds back further out.
            }
            let place = warp([0, 1].map(|i| f64::from(h) * g[0][i] + f64::from(k) * g[1][i]));
            let envelope = sinc2(open[0] * f64::from(h)) * sinc2(open[1] * f64::from(k));
            let bright = envelope * (1.0 + 0.3 * (2.0 * random.random::<f64>() - 1.0)) * if (h, k) == (0, 0) { zero_factor } else { 1.0 };
            let absent = bright < faintest || (recipe.hidden_zero && (h, k) == (0, 0)) || (recipe.odd_only && h % 2 == 0 && h != 0);
            if absent || !made.sees(place) {
                continue;
            }
            let seen = [place[0] + u * normal(random), place[1] + u * normal(random)];
            made.points.push(Point::new(seen, u, bright));
            made.truth.push(Some((h, k)));
            if recipe.ghost * bright > faintest {
                ghosts.push(Point::new([seen[0] + shift[0], seen[1] + shift[1]], u, recipe.ghost * bright));
            }
        }
    }
    let count = (recipe.junk * made.points.len() as f64).round() as usize;
    let strewn = (0..count).map(|_| {
        let at = [random.random_range(window[0]..window[1]), random.random_range(window[2]..window[3])];
        Point::new(at, u, 10.0_f64.powf(random.random_range(faintest.log10()..0.0)))
    });
    ghosts.extend(strewn);
    made.truth.extend(ghosts.iter().map(|_| None));
    made.points.extend(ghosts);
    for p in &mut made.points {
        p.at = [p.at[0] + offset[0], p.at[1] + offset[1]];
    }
    made.window = [window[0] + offset[0], window[1] + offset[0], window[2] + offset[1], window[3] + offset[1]];
    made
}

/// The visible orders fix their lattice: enough of them, and their differences from zero generate all orders.
fn decidable(made: &Made, line: bool) -> bool {
    let orders: Vec<(i32, i32)> = made.truth.iter().flatten().copied().collect();
    let all_in = |a: i32, b: i32, m: i32| orders.iter().filter(|n| (a * n.0 + b * n.1).rem_euclid(m) != 0).count() < 3;
    let thin = if line {
        all_in(1, 0, 2) || all_in(1, 0, 3)
    } else {
        [(1, 0, 2), (0, 1, 2), (1, 1, 2), (1, 0, 3), (0, 1, 3), (1, 1, 3), (1, 2, 3)].iter().any(|(a, b, m)| all_in(*a, *b, *m))
    };
    orders.len() >= if line { 5 } else { 9 } && !thin
}

/// What is wrong with a numbering, if anything: orders must agree up to one unimodular change of basis that keeps zero.
fn fault(made: &Made, line: bool, found: &Indexed) -> Option<String> {
    if line != (found.shape == Shape::Line) {
        return Some(format!("shape {:?}", found.shape));
    }
    let pairs: Vec<((i32, i32), (i32, i32))> = made.truth.iter().zip(&found.order).filter_map(|(t, f)| Some(((*t)?, (*f)?))).collect();
    let orders = made.truth.iter().flatten().count();
    if pairs.len() + orders / 20 + 1 < orders {
        let lost: Vec<_> =
            found.rejected.iter().filter(|(i, _)| made.truth[*i].is_some()).take(6).map(|(i, r)| (made.truth[*i], r)).collect();
        return Some(format!("{} of {orders} orders kept, lost {lost:?}", pairs.len()));
    }
    for i in 0..pairs.len() {
        for j in i + 1..pairs.len() {
            let ((p, a), (q, b)) = (pairs[i], pairs[j]);
            let det = p.0 * q.1 - p.1 * q.0;
            let rows = if line && p.0 != 0 {
                let s = if a.0 == p.0 { 1 } else { -1 };
                [[s, 0], [0, 1]]
            } else if det != 0 {
                let solve = |x: i32, y: i32| [(x * q.1 - y * p.1), (y * p.0 - x * q.0)];
                let (top, low) = (solve(a.0, b.0), solve(a.1, b.1));
                if [top, low].iter().flatten().any(|n| n % det != 0) {
                    return Some("orders map by no whole numbers".into());
                }
                [top.map(|n| n / det), low.map(|n| n / det)]
            } else {
                continue;
            };
            let unimodular = (rows[0][0] * rows[1][1] - rows[0][1] * rows[1][0]).abs() == 1;
            let all = pairs.iter().filter(|(t, f)| (rows[0][0] * t.0 + rows[0][1] * t.1, rows[1][0] * t.0 + rows[1][1] * t.1) == *f);
            let agree = all.count();
            return (!unimodular || agree != pairs.len())
                .then(|| format!("{agree} of {} orders agree, basis change {rows:?}", pairs.len()));
        }
    }
    Some("nothing to compare".into())
}

/// Numbers patterns of many seeds; gives the share at fault and the faults.
fn trial(name: &str, recipe: &Recipe, seeds: std::ops::Range<u64>) -> (usize, Vec<String>) {
    let (mut tried, mut faults) = (0, Vec::new());
    for seed in seeds {
        let made = make(recipe, seed);
        if !decidable(&made, recipe.line) {
            continue;
        }
        tried += 1;
        let told = match made.index() {
            Ok(found) => fault(&made, recipe.line, &found).map(|f| format!("{f}; {:?} {:?}", found.evidence, found.warnings)),
            Err(error) => Some(error.to_string()),
        };
        faults.extend(told.map(|f| format!("{name} seed {seed} ({} points): {f}", made.points.len())));
    }
    println!("{name}: {} of {tried} at fault", faults.len());
    (tried, faults)
}

#[test]
fn survey() {
    let n: u64 = std::env::var("SURVEY").ok().and_then(|s| s.parse().ok()).unwrap_or(40);
    let recipes = [
        ("plain", PLAIN),
        ("junk", Recipe { junk: 1.5, ..PLAIN }),
        ("ghost", Recipe { ghost: 0.1, junk: 0.3, ..PLAIN }),
        ("hidden", Recipe { hidden_zero: true, ..PLAIN }),
        ("odd", Recipe { odd_only: true, ..PLAIN }),
        ("odd hidden", Recipe { odd_only: true, hidden_zero: true, ..PLAIN }),
        ("line", Recipe { line: true, ..PLAIN }),
        ("line junk", Recipe { line: true, junk: 0.5, ..PLAIN }),
        ("line hidden", Recipe { line: true, hidden_zero: true, ..PLAIN }),
        ("line odd", Recipe { line: true, odd_only: true, ..PLAIN }),
        ("line ghost", Recipe { line: true, ghost: 0.1, ..PLAIN }),
        ("bent", Recipe { distortion: 0.06, ..PLAIN }),
    ];
    for (name, recipe) in recipes {
        let start = std::time::Instant::now();
        let (tried, faults) = trial(name, &recipe, 0..n);
        println!("   {:.1} ms each", start.elapsed().as_secs_f64() * 1e3 / (tried.max(1) as f64));
        for f in faults.iter().take(4) {
            println!("   {f}");
        }
    }
}

#[test]
fn debug_one() {
    let (seed, recipe) = match std::env::var("DEBUG_CASE").as_deref() {
        Ok("line") => (14, Recipe { line: true, junk: 0.5, ..PLAIN }),
        _ => (7, Recipe { junk: 1.5, ..PLAIN }),
    };
    let made = make(&recipe, seed);
    super::indexing::debug(&made.points, &|at| made.sees(at), &made.truth);
}

#[test]
fn chance_survey() {
    let n: u64 = std::env::var("CHANCE").ok().and_then(|s| s.parse().ok()).unwrap_or(50);
    for (name, kind) in [("even", 0), ("clustered", 1), ("row", 2)] {
        for count in [3_usize, 4, 5, 6, 8, 12, 20, 40, 80, 150] {
            let start = std::time::Instant::now();
            let mut accepted = Vec::new();
            for seed in 0..n {
                let random = &mut ChaCha8Rng::seed_from_u64(seed * 1000 + count as u64);
                let points: Vec<Point> = (0..count)
                    .map(|_| {
                        let at = match kind {
                            0 => [random.random_range(-0.27..0.27), random.random_range(-0.2..0.2)],
                            1 => [0.08 * normal(random), 0.08 * normal(random)],
                            _ => {
                                let t = random.random_range(-0.25..0.25);
                                [t, 0.3 * t + 2e-4 * normal(random)]
                            }
                        };
                        Point::new(at, 2e-4, 10.0_f64.powf(random.random_range(-2.0..1.0)))
                    })
                    .collect();
                if let Ok(found) = index(&points, &IndexOptions::default(), &|at| at[0].abs() < 0.3 && at[1].abs() < 0.25) {
                    accepted.push((seed, found.shape, found.evidence.explained, found.evidence.log_evidence.round()));
                }
            }
            println!(
                "{name} {count}: {} of {n}, {:.1} ms each {:?}",
                accepted.len(),
                start.elapsed().as_secs_f64() * 1e3 / n as f64,
                accepted.iter().take(5).collect::<Vec<_>>()
            );
        }
    }
}
