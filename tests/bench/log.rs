//! A log of 100,000 entries: listing a page, finding by sample and by day, verifying everything. `cargo bench --bench log`.
#![allow(
    clippy::unwrap_used,
    clippy::print_stdout,
    missing_docs,
    reason = "a bench fails where it stands and says what it measured; criterion makes undocumented items"
)]

use criterion::{Criterion, criterion_group, criterion_main};
use spotrule::log::{Draft, Filter, Log, Outcome};
use std::hint::black_box;

const ENTRIES: u32 = 100_000;

/// A result of 8 kB, as one with some 60 orders has.
fn result(number: u32) -> String {
    let outcome = ["inside", "inside", "inside", "undecided", "outside"][(number % 5) as usize];
    format!(
        r#"{{"schema":"spotrule.measurement/1","program":{{"version":"1.0.0","commit":"abc"}},"status":"measured","sample":"lot {}","operator":"A","pitch":[{{"value":20.0{:04},"u":0.001,"U":0.002,"k":2.0,"unit":"um"}}],"warnings":[],"limits":{{"outcome":"{outcome}"}},"filling":"{}"}}"#,
        number / 10,
        number % 100,
        "0.123456789,".repeat(650)
    )
}

fn time(number: u32) -> String {
    let (day, second) = (number / 1000, number % 1000);
    format!("2030-{:02}-{:02}T10:{:02}:{:02}.000Z", 1 + day / 28 % 12, 1 + day % 28, second / 60, second % 60)
}

fn log(criterion: &mut Criterion) {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("book.db");
    let mut writer = Log::open(&path).unwrap();
    let begun = std::time::Instant::now();
    for number in 0..ENTRIES {
        writer.append(&Draft::of_result(&result(number), None).unwrap(), &time(number)).unwrap();
    }
    let appending = begun.elapsed();
    println!("{ENTRIES} entries appended one by one in {appending:.1?}: {:.2?} each", appending / ENTRIES);
    drop(writer);
    println!("file: {} MB", std::fs::metadata(&path).unwrap().len() / 1_000_000);
    let reader = Log::read(&path).unwrap();
    let page = |filter: Filter| reader.list(black_box(&filter), 50).unwrap().len();
    let sample = |text: &str| Filter { sample: Some(text.to_owned()), ..Filter::default() };
    let mut group = criterion.benchmark_group("log");
    group.sample_size(10);
    group.bench_function("list newest", |bench| bench.iter(|| page(Filter::default())));
    group.bench_function("list by sample", |bench| bench.iter(|| page(sample("lot 5000"))));
    group.bench_function("list by sample with wildcard, none found", |bench| bench.iter(|| page(sample("*none*"))));
    group.bench_function("list by outcome", |bench| bench.iter(|| page(Filter { outcome: Some(Outcome::Outside), ..Filter::default() })));
    let day = || Filter { since: Some("2030-02-03".to_owned()), before: Some("2030-02-04".to_owned()), ..Filter::default() };
    group.bench_function("list one day", |bench| bench.iter(|| page(day())));
    group.bench_function("verify all", |bench| {
        bench.iter(|| {
            let report = reader.verify(None).unwrap();
            assert!(report.entries == u64::from(ENTRIES) && report.findings.is_empty());
        });
    });
    group.finish();
}

criterion_group!(benches, log);
criterion_main!(benches);
