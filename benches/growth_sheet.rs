//! Speed of the HTML growth sheet of a 40-fold cascade of 16 layers, from the file's text to the page's, beside the solve
//! of the same 640 layers that stands in its head. `cargo bench --bench growth_sheet`.

use criterion::{Criterion, criterion_group, criterion_main};
use std::hint::black_box;
use wellwright::growth;
use wellwright::models::BandOperator;
use wellwright::optics::transitions;
use wellwright::report::Sheet;
use wellwright::structure;
use wellwright::subbands::{Accuracy, Subbands, solve};

const STATES: usize = 4;

fn cascade() -> String {
    let mut text = String::from(
        "title: Cascade\nsubstrate: GaAs\ntemperature: 77 K\nfield: -11 kV/cm\n\
         bands: {conduction: {model: parabolic, states: 4}}\nlayers:\n  - repeat: 40\n    layers:\n",
    );
    for (index, monolayers) in [29, 9, 24, 14, 54, 9, 34, 17, 17, 17, 17, 7, 17, 7, 17, 7]
        .iter()
        .enumerate()
    {
        // One barrier is not given by the cells, so that alternatives are looked for.
        let material = match index {
            3 => "Al0.2Ga0.8As",
            _ if index % 2 == 1 => "Al0.15Ga0.85As",
            _ => "GaAs",
        };
        text += &format!("      - {{material: {material}, width: {monolayers} ML}}\n");
    }
    text + "growth: {rates: {Ga: 0.85 ML/s, Al: 0.15 ML/s}}\n"
}

fn solved(text: &str) -> (structure::Structure, structure::Stack, Subbands) {
    let (file, _) = structure::read(text);
    let file = file.expect("the file is right");
    let stack = file.stack().expect("the stack is right");
    let operator = BandOperator::conduction(&stack, file.conduction.model).expect("it suits");
    let subbands = solve(&operator, STATES, Accuracy::default());
    drop(operator);
    (file, stack, subbands)
}

fn page(text: &str) -> String {
    let (file, stack, subbands) = solved(text);
    let plan = growth::plan(&file, &stack).expect("it can be grown");
    let chamber = file.growth.as_ref().expect("it has cells");
    let transitions = transitions(&subbands);
    Sheet::new(&file, chamber, &stack, &plan, &transitions, STATES).html(&[])
}

fn bench(c: &mut Criterion) {
    let text = cascade();
    println!("the page has {} bytes", page(&text).len());
    let mut group = c.benchmark_group("cascade of 40 times 16 layers");
    group.sample_size(20);
    group.bench_function("read and solve alone", |b| {
        b.iter(|| black_box(solved(&text)))
    });
    group.bench_function("whole HTML sheet", |b| b.iter(|| black_box(page(&text))));
    group.finish();
}

criterion_group!(benches, bench);
criterion_main!(benches);
