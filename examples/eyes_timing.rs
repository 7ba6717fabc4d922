//! CPU time of decoding against finding, on photos given as arguments.
use spotrule::{photo, spots};

fn ticks() -> f64 {
    let stat = std::fs::read_to_string("/proc/self/stat").unwrap();
    let f: Vec<&str> = stat.rsplit(')').next().unwrap().split_whitespace().collect();
    f[11].parse::<f64>().unwrap() * 10.0
}
fn cpu(mut work: impl FnMut()) -> f64 {
    let start = ticks();
    for _ in 0..12 { work(); }
    (ticks() - start) / 12.0
}

fn main() {
    for path in std::env::args().skip(1) {
        let bytes = std::fs::read(&path).unwrap();
        let photo = photo::decode(&bytes).unwrap();
        let decode = cpu(|| drop(photo::decode(&bytes)));
        let linear = cpu(|| drop(photo.linear()));
        let half = cpu(|| drop(photo.linear().half_planes()));
        let light = cpu(|| drop(photo.light([1.0, 0.0, 0.0])));
        let find = cpu(|| drop(spots::find(&photo, &spots::SpotOptions::default())));
        println!("{}x{} CPU ms: decode {decode:.0} linear {linear:.0} +half {half:.0} light {light:.0} find {find:.0}", photo.width, photo.height);
    }
}
