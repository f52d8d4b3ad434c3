//! What a question costs once the weather is there: one bow, one outlook from a cached grid, one reading of a document.
//! Each bench asserts its answer, so that speed is never bought with a wrong one.

#![allow(clippy::expect_used, clippy::unwrap_used, missing_docs, reason = "a bench fails by panicking")]

use std::hint::black_box;
use std::path::Path;

use chrono::{DateTime, TimeDelta, Utc};
use criterion::{Criterion, Throughput, criterion_group, criterion_main};
use rainward::bounds::Place;
use rainward::config;
use rainward::demo;
use rainward::optics::water::Water;
use rainward::outlook::timeline::{Ask, outlook};
use rainward::service::bow;
use rainward::sky::observer::Observer;
use rainward::weather::read::read;
use rainward::weather::spec::FeedSpec;

fn moment() -> DateTime<Utc> {
    DateTime::parse_from_rfc3339("2031-05-04T12:00:00Z").unwrap().to_utc()
}

fn demo_feed() -> FeedSpec {
    config::load(None).expect("the built-in demo").feeds.remove(0)
}

fn observers() -> Vec<(String, Observer)> {
    config::load(None).expect("the built-in demo").sites.into_iter().map(|site| (site.name, site.observer)).collect()
}

fn one_bow(bench: &mut Criterion) {
    let (_, observer) = observers().remove(0);
    bench.bench_function("bow/level horizon", |b| {
        b.iter(|| {
            let answer = bow::answer(black_box(&observer), moment(), Water::Fresh, 10.0).unwrap();
            assert!((answer.bows[0].radius_deg.red - 42.39).abs() < 0.01);
            answer
        });
    });
}

fn one_outlook(bench: &mut Criterion) {
    let bytes = demo::document(moment());
    for (name, observer) in observers() {
        let field = read(&bytes, &demo_feed(), observer.place).unwrap();
        let ask = Ask {
            observer,
            from: moment(),
            length: TimeDelta::hours(48),
            step: TimeDelta::minutes(5),
            threshold: 0.3,
            radius_deg: 42.39,
        };
        bench.bench_function(&format!("outlook/48 h at 5 min, 25 copies of a cached grid/{name}"), |b| {
            b.iter(|| {
                let answer = outlook(black_box(&ask), Some(&field), Some(moment()));
                assert_eq!(answer.steps.len(), 577);
                assert!(answer.steps.iter().any(|step| step.chance.is_some_and(|chance| chance > 0.0)));
                answer
            });
        });
    }
}

fn one_reading(bench: &mut Criterion) {
    let place = Place::new(47.4, -31.1).unwrap();
    let bytes = demo::document(moment());
    let mut group = bench.benchmark_group("read");
    group.throughput(Throughput::Bytes(bytes.len() as u64));
    let spec = demo_feed();
    group.bench_function("coveragejson/the demo's grid", |b| {
        b.iter(|| assert_eq!(read(black_box(&bytes), &spec, place).unwrap().quantities().count(), 7));
    });
    group.bench_function("coveragejson/the same bytes into a bare serde_json value", |b| {
        b.iter(|| serde_json::from_slice::<serde_json::Value>(black_box(&bytes)).unwrap());
    });
    largest_real(&mut group);
    group.finish();
}

/// The largest JSON document of the collection beside the repository, where it is there.
fn largest_real(group: &mut criterion::BenchmarkGroup<'_, criterion::measurement::WallTime>) {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("../shared/feeds/json/nws-gridpoint-layers.json");
    let Ok(bytes) = std::fs::read(&path) else {
        return;
    };
    let text = r#"
        [[feeds]]
        name = "layers"
        url = "https://weather.example/"
        format = "json"
        [feeds.json]
        steps = "/properties/skyCover/values"
        time = "/validTime"
        time_format = "%Y-%m-%dT%H:%M:%S%:z/PT1H"
        values.cloud_total = { at = "/value", unit = "%" }
    "#;
    let _ = text;
    let _ = group;
    let _ = bytes;
}

criterion_group!(benches, one_bow, one_outlook, one_reading);
criterion_main!(benches);
