//! Times decoding against finding, on photos given as arguments.
use std::time::Instant;

use spotrule::{photo, spots};

fn best(mut work: impl FnMut()) -> f64 {
    let run = |work: &mut dyn FnMut()| {
        let start = Instant::now();
        work();
        start.elapsed().as_secs_f64() * 1e3
    };
    (0..7).map(|_| run(&mut work)).fold(f64::INFINITY, f64::min)
}

fn main() {
    for path in std::env::args().skip(1) {
        let bytes = std::fs::read(&path).unwrap();
        let photo = photo::decode(&bytes).unwrap();
        let decode = best(|| drop(photo::decode(&bytes)));
        let linear = best(|| drop(photo.linear()));
        let half = best(|| drop(photo.linear().half_planes()));
        let light = best(|| drop(photo.light([1.0, 0.0, 0.0])));
        let grey = best(|| drop(photo.grey()));
        let find = best(|| drop(spots::find(&photo, &spots::SpotOptions::default())));
        println!("{}x{} decode {decode:.1} linear {linear:.1} +half {half:.1} light {light:.1} grey {grey:.1} find {find:.1} ms", photo.width, photo.height);
    }
}
