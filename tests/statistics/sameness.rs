//! The same draws whatever the machine does: threads and chains moved in lockstep change no bit.

use crate::cases::study;
use ratewright::fit::{self, Machine, Unwatched};
use ratewright::model::Model;
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
