//! The same draws whatever the machine does: threads and chains moved in lockstep change no bit.

use crate::cases::study;
use crate::designs::design;
use ratewright::fit::{self, Machine, Unwatched};
use ratewright::model::{BaselinePrior, Model, NormalPrior, ScatterPrior};
use ratewright::numeric::{Purpose, Stream};
use ratewright::spec::Steps;

#[test]
fn neither_threads_nor_the_lockstep_width_change_a_bit() {
    for case in ["clinic.nb2", "ships.poisson", "quine.nb2"] {
        for steps in [Steps::Mixed, Steps::Walk] {
            let (mut spec, design) = study(case);
            spec.sampling.steps = steps;
            // Five chains: no width or number of threads below divides them.
            spec.sampling.chains = 5;
            spec.sampling.most_draws = 4_000;
            let model = Model::new(&spec, &design);
            let bits = |threads, lockstep| {
                let fit = fit::run(&model, &spec, Machine { threads, lockstep }, &Unwatched).unwrap();
                let draws: Vec<u64> = fit.draws.values.iter().flatten().map(|value| value.to_bits()).collect();
                (draws, format!("{:?}", fit.assessments), fit.reference)
            };
            let one = bits(1, 1);
            assert!(one.0.len() > 4_000);
            for (threads, lockstep) in [(1, 2), (1, 8), (2, 1), (2, 4), (4, 3)] {
                assert_eq!(
                    bits(threads, lockstep),
                    one,
                    "{case}: {threads} threads, {lockstep} in lockstep"
                );
            }
        }
    }
}

/// With more threads than chains, and evaluations long enough to share, the points of one chain go to
/// several threads.
#[test]
fn threads_beyond_the_chains_change_no_bit() {
    let rows = 40_000;
    let mut stream = Stream::new(5, Purpose::Simulation, 0);
    let columns = (0..12).map(|_| (0..rows).map(|_| stream.normal()).collect()).collect();
    let counts = (0..rows).map(|_| stream.poisson(3.0)).collect();
    let design = design(columns, vec![1.0; rows], counts);
    let (mut spec, _) = study("quine.nb2");
    spec.sampling.chains = 4;
    spec.sampling.most_draws = 400;
    let baseline = BaselinePrior::Range(NormalPrior { mean: 1.0, sd: 1.0 });
    let terms = vec![NormalPrior { mean: 0.0, sd: 1.0 }; 12];
    let model = Model::with_priors(&design, baseline, terms, Some(ScatterPrior { rate: 3.0 }));
    let bits = |threads, lockstep| {
        let fit = fit::run(&model, &spec, Machine { threads, lockstep }, &Unwatched).unwrap();
        fit.draws
            .values
            .iter()
            .flatten()
            .map(|value| value.to_bits())
            .collect::<Vec<u64>>()
    };
    let one = bits(1, 1);
    for (threads, lockstep) in [(8, 8), (9, 3), (40, 8)] {
        assert_eq!(bits(threads, lockstep), one, "{threads} threads, {lockstep} together");
    }
}
