//! Time of every room and of the whole on one bench, by size of the photo and number of spots. docs/performance.md keeps the ratios.

#![allow(missing_docs, clippy::unwrap_used, reason = "criterion's macro writes a public function; a bench fails where it stands")]

use criterion::{BenchmarkId, Criterion, Throughput, criterion_group, criterion_main};
use spotrule::{
    bench::Bench,
    measure::{Inputs, PhotoFile, measure},
    photo,
    spots::{self, SpotOptions},
    synth::{Scene, demo_scene, encode, render_pattern, render_target},
    target::{self, ReadOptions},
};
use std::{hint::black_box, time::Duration};

/// The filter mesh before a camera of `mega_px`: more pixels on the same bench.
fn scene(mega_px: f64) -> Scene {
    let mut scene = demo_scene("filter-mesh").unwrap();
    let fraction = (mega_px * 1e6 / f64::from(scene.file.width_px * scene.file.height_px)).sqrt();
    #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "a picture size")]
    let scaled = |side: u32| (f64::from(side) * fraction).round() as u32;
    (scene.file.width_px, scene.file.height_px) = (scaled(scene.file.width_px), scaled(scene.file.height_px));
    scene.camera.lens.focal_px *= fraction;
    scene.camera.lens.blur_px *= fraction;
    scene.camera.lens.principal_px = scene.camera.lens.principal_px.map(|place| (place + 0.5) * fraction - 0.5);
    scene
}

struct Files {
    pattern: Vec<u8>,
    target: Vec<u8>,
    bench: Bench,
}

fn files(scene: &Scene) -> Files {
    let jpeg = |photo| encode(scene, &photo).unwrap();
    Files { pattern: jpeg(render_pattern(scene).unwrap()), target: jpeg(render_target(scene).unwrap()), bench: scene.bench() }
}

fn whole(files: &Files) {
    let patterns = vec![PhotoFile { name: "pattern.jpg", bytes: &files.pattern }];
    let targets = vec![PhotoFile { name: "target.jpg", bytes: &files.target }];
    black_box(measure(&Inputs { patterns, targets }, &files.bench).unwrap());
}

/// Every room at 1 to 48 megapixels.
fn by_pixels(criterion: &mut Criterion) {
    for mega_px in [1_u64, 3, 12, 48] {
        #[expect(clippy::cast_precision_loss, reason = "a small number")]
        let files = files(&scene(mega_px as f64));
        let mut group = criterion.benchmark_group("pixels");
        group.sample_size(10).measurement_time(Duration::from_secs(4)).throughput(Throughput::Elements(mega_px));
        let case = |room: &str| BenchmarkId::new(room, mega_px);
        group.bench_function(case("decode-both"), |bencher| {
            bencher.iter(|| (photo::decode(black_box(&files.pattern)).unwrap(), photo::decode(black_box(&files.target)).unwrap()));
        });
        let (pattern, target) = (photo::decode(&files.pattern).unwrap(), photo::decode(&files.target).unwrap());
        group.bench_function(case("spots"), |bencher| bencher.iter(|| spots::find(&pattern, &SpotOptions::default()).unwrap()));
        group.bench_function(case("target"), |bencher| bencher.iter(|| target::read(&target.grey(), &ReadOptions::default()).unwrap()));
        group.bench_function(case("whole"), |bencher| bencher.iter(|| whole(&files)));
        group.finish();
    }
}

criterion_group!(benches, by_pixels);
criterion_main!(benches);
