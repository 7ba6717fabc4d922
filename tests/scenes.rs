//! Photos drawn from known truth, measured.

use spotrule::{
    bench::Bench,
    measure::{Inputs, Measurement, PhotoFile, Refusal, measure},
    synth::{Dots, Scene, demo_scene, encode, render_marked, render_pattern, render_target},
};

/// A demo scene at a fraction of its size, so that a test takes a moment: the same bench before a coarser camera.
pub(crate) fn small(name: &str, fraction: f64) -> Scene {
    let mut scene = demo_scene(name).unwrap();
    let shrunk = |side: u32| (f64::from(side) * fraction).round() as u32;
    scene.file.width_px = shrunk(scene.file.width_px);
    scene.file.height_px = shrunk(scene.file.height_px);
    scene.camera.lens.focal_px *= fraction;
    scene.camera.lens.principal_px = scene.camera.lens.principal_px.map(|place| (place + 0.5) * fraction - 0.5);
    scene
}

/// The encoded photos of a scene: pattern, and target where it has a photo of its own.
pub(crate) struct Photos {
    pub(crate) pattern: Vec<u8>,
    pub(crate) target: Option<Vec<u8>>,
}

pub(crate) fn drawn(scene: &Scene) -> Photos {
    let pattern = if scene.print.dots == Dots::InPattern { render_marked(scene) } else { render_pattern(scene) }.unwrap();
    let target = (scene.print.dots == Dots::OwnPhoto).then(|| encode(scene, &render_target(scene).unwrap()).unwrap());
    Photos { pattern: encode(scene, &pattern).unwrap(), target }
}

pub(crate) fn measured(scene: &Scene, photos: &Photos, bench: &Bench) -> Result<Measurement, Refusal> {
    let patterns = vec![PhotoFile { name: scene.pattern_file(), bytes: &photos.pattern }];
    let targets = photos.target.iter().map(|bytes| PhotoFile { name: scene.target_file(), bytes }).collect();
    measure(&Inputs { patterns, targets }, bench)
}

/// True pitches, shortest first, m, and the true lattice angle, 90° or more, rad, by plain enumeration of short lattice vectors.
pub(crate) fn truth(scene: &Scene) -> (Vec<f64>, Option<f64>) {
    let (a, Some(b)) = scene.sample.lattice.direct_m() else {
        return (vec![scene.sample.lattice.direct_m().0[0].hypot(scene.sample.lattice.direct_m().0[1])], None);
    };
    let mut vectors: Vec<[f64; 2]> = (-4..=4)
        .flat_map(|m| (-4..=4).map(move |n| (f64::from(m), f64::from(n))))
        .filter(|&(m, n)| (m, n) > (0.0, -9.0) && (m != 0.0 || n > 0.0))
        .map(|(m, n)| [m * a[0] + n * b[0], m * a[1] + n * b[1]])
        .collect();
    vectors.sort_by(|p, q| p[0].hypot(p[1]).total_cmp(&q[0].hypot(q[1])));
    let (p, cross) = (vectors[0], |q: [f64; 2]| vectors[0][0] * q[1] - vectors[0][1] * q[0]);
    let area = (a[0] * b[1] - a[1] * b[0]).abs();
    let q = *vectors[1..].iter().find(|q| cross(**q).abs() > 0.5 * area).unwrap();
    let cosine = (p[0] * q[0] + p[1] * q[1]) / (p[0].hypot(p[1]) * q[0].hypot(q[1]));
    (vec![p[0].hypot(p[1]), q[0].hypot(q[1])], Some((-cosine.abs()).acos()))
}
