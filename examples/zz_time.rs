use ratewright::*;
use std::path::Path;
use std::time::Instant;
fn main() {
    let case = std::env::args().nth(1).unwrap();
    let p: f64 = std::env::args().nth(2).unwrap().parse().unwrap();
    let walk = std::env::args().nth(3).is_some();
    let f = Path::new("tests/reference").join(format!("{case}.toml"));
    let mut spec = spec::read(&f).unwrap();
    spec.sampling.precision = p;
    spec.sampling.most_draws = 4_000_000;
    if walk {
        spec.sampling.steps = spec::Steps::Walk;
    }
    let table = table::read_csv("x", &Path::new("tests/reference").join(&spec.data.file.value)).unwrap();
    let design = design::build(&spec, &table).unwrap();
    let model = model::Model::new(&spec, &design);
    let t = Instant::now();
    let _ = fit::laplace(&model).unwrap();
    println!("laplace {:?}", t.elapsed());
    let t = Instant::now();
    let fit = fit::run(&model, &spec, fit::Machine::default(), &fit::Unwatched).unwrap();
    println!(
        "run {:?} draws {} acc {} {}",
        t.elapsed(),
        fit.draws.in_all(),
        fit.accepted,
        fit.reference
    );
    for (k, v) in fit.draws.values.iter().enumerate() {
        let t = Instant::now();
        let a = fit::assess(v, fit.draws.chains, 0.95);
        println!(
            "assess {:?} ess/draw {:.3} tail {:.3} {}",
            t.elapsed(),
            a.effective_draws / fit.draws.in_all() as f64,
            a.effective_tail_draws / fit.draws.in_all() as f64,
            fit.draws.parameters[k]
        );
    }
}
