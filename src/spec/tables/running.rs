//! How to sample and how to tell: `[sampling]`, `[report]`.

use super::build::{choice, defaulted, not_yet, table};
use crate::spec::keys::{Bounds, DefaultValue, End, Kind, TableInfo, Times};

pub(super) const SAMPLING: TableInfo = table(
    "sampling",
    Times::AtMostOnce,
    &[
        defaulted(
            "chains",
            Kind::Whole { from: 4, to: 64 },
            "8",
            DefaultValue::Whole(4),
            "Number of chains.",
        ),
        defaulted(
            "steps",
            Kind::Choice(
                &[
                    choice(
                        "mixed",
                        "independence Metropolis steps mixed with random-walk Metropolis steps",
                    ),
                    choice(
                        "walk",
                        "random-walk Metropolis steps alone: slow, an independent route to the same answer",
                    ),
                ],
                &[],
            ),
            "\"walk\"",
            DefaultValue::Choice("mixed"),
            "Kind of steps.",
        ),
        defaulted(
            "precision",
            Kind::Number(Bounds {
                lower: End::Included(0.001),
                upper: End::Included(0.5),
            }),
            "0.01",
            DefaultValue::Number(0.02),
            "Sampling may stop once the simulation error of every mean is at most this many posterior standard \
             deviations, and that of every interval end at most 2.5 times it.",
        ),
        defaulted(
            "most_draws",
            Kind::Whole {
                from: 1_000,
                to: 50_000_000,
            },
            "400000",
            DefaultValue::Whole(200_000),
            "Sampling stops at this many kept draws, all chains together, whether or not the precision is met; the \
             outputs say which.",
        ),
    ],
    "How long to sample.",
);

pub(super) const REPORT: TableInfo = TableInfo {
    not_yet: &[not_yet("accept", "accepted checks")],
    ..table(
        "report",
        Times::AtMostOnce,
        &[
            defaulted(
                "interval",
                Kind::Number(Bounds {
                    lower: End::Included(0.5),
                    upper: End::Included(0.999),
                }),
                "0.9",
                DefaultValue::Number(0.95),
                "Level of every interval, equal-tailed.",
            ),
            defaulted(
                "hide_counts_below",
                Kind::Whole { from: 0, to: 1_000_000 },
                "10",
                DefaultValue::Whole(5),
                "Counts below this are hidden in what is shown to people, since a small count can identify a person.",
            ),
            defaulted(
                "show_zero",
                Kind::Switch,
                "true",
                DefaultValue::Switch(false),
                "Whether a count of 0 is shown all the same.",
            ),
        ],
        "How results are told.",
    )
};
