//! Speed of the optics: one Airy profile, spheres of three sizes at 400 angles, one answer on light.

#![allow(missing_docs, clippy::unwrap_used, reason = "a benchmark")]

use std::hint::black_box;

use criterion::{Criterion, criterion_group, criterion_main};
use num_complex::Complex;
use rainward::optics::airy::AiryBow;
use rainward::optics::light::asked::Asked;
use rainward::optics::light::{Prepared, answer};
use rainward::optics::mie::Sphere;
use rainward::optics::scene::{View, prepare, prominence};

fn optics(criterion: &mut Criterion) {
    let angles: Vec<f64> = (0..400).map(|step| 120.0 + f64::from(step) * 0.075).collect();
    let cosines: Vec<f64> = angles.iter().map(|angle| angle.to_radians().cos()).collect();
    criterion.bench_function("airy, primary, 400 angles", |bencher| {
        bencher.iter(|| {
            let bow = AiryBow::new(black_box(5712.0), 1.335, 1).unwrap();
            angles.iter().map(|angle| bow.intensity(*angle).mean()).sum::<f64>()
        });
    });
    for x in [100.0, 1000.0, 6000.0] {
        criterion.bench_function(&format!("mie, x = {x}, 400 angles"), |bencher| {
            bencher.iter(|| {
                Sphere::new(black_box(x), Complex::new(1.335, 0.0)).unwrap().waves.intensities(black_box(&cosines))
            });
        });
    }
    let question = Asked { sun_elevation_deg: Some(15.0), ..Asked::default() }.check().unwrap();
    criterion.bench_function("light, 5 mm/h, nothing prepared", |bencher| {
        bencher.iter(|| answer(&question, &Prepared::new(black_box(&question)).unwrap()));
    });
    let prepared = Prepared::new(&question).unwrap();
    criterion.bench_function("light, 5 mm/h, drops prepared", |bencher| {
        bencher.iter(|| answer(black_box(&question), &prepared));
    });
    prepare();
    criterion.bench_function("prominence for the outlook", |bencher| {
        bencher.iter(|| prominence(black_box(3.0), black_box(View { lit: 0.2, optical_depth: 0.7 }), black_box(12.3)));
    });
}

criterion_group!(benches, optics);
criterion_main!(benches);
