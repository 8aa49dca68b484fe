//! The one list of tables and keys: reader, schema and docs all follow it.

use super::keys::{Bounds, Choice, DefaultValue, End, KeyInfo, Kind, LeftOut, NotYet, TableInfo, Times};

/// Every table that a spec may hold, in the order of the docs.
pub static TABLES: &[TableInfo] = &[
    STUDY, DATA, INCIDENTS, EXPOSURE, FAMILY, BASELINE, COVARIATE, JOINT, SAMPLING, REPORT,
];

/// Tables that are planned and that this version refuses by name.
pub static TABLES_NOT_YET: &[NotYet] = &[
    NotYet {
        name: "grouping",
        what: "rates that vary from group to group",
    },
    NotYet {
        name: "contrast",
        what: "answers averaged over rows",
    },
];

/// A key that may not be left out.
const fn required(name: &'static str, kind: Kind, example: &'static str, meaning: &'static str) -> KeyInfo {
    KeyInfo {
        name,
        kind,
        left_out: LeftOut::Refused,
        meaning,
        example,
        only_with: &[],
    }
}

/// A key that may be left out, which then `means` something.
const fn optional(
    name: &'static str,
    kind: Kind,
    example: &'static str,
    means: &'static str,
    meaning: &'static str,
) -> KeyInfo {
    KeyInfo {
        left_out: LeftOut::Means(means),
        ..required(name, kind, example, meaning)
    }
}

/// A key with a default.
const fn defaulted(
    name: &'static str,
    kind: Kind,
    example: &'static str,
    default: DefaultValue,
    meaning: &'static str,
) -> KeyInfo {
    KeyInfo {
        left_out: LeftOut::Default(default),
        ..required(name, kind, example, meaning)
    }
}

/// The same key, allowed only with these values of the deciding key.
const fn only_with(values: &'static [&'static str], key: KeyInfo) -> KeyInfo {
    KeyInfo {
        only_with: values,
        ..key
    }
}

/// A table without a deciding key, a choice of keys, or anything planned.
const fn table(name: &'static str, times: Times, keys: &'static [KeyInfo], meaning: &'static str) -> TableInfo {
    TableInfo {
        name,
        times,
        meaning,
        keys,
        decided_by: None,
        exactly_one_of: &[],
        not_yet: &[],
    }
}

/// `provisional`, which may stand beside every prior.
const PROVISIONAL: KeyInfo = defaulted(
    "provisional",
    Kind::Switch,
    "true",
    DefaultValue::Switch(false),
    "Marks a prior that nobody has thought about yet; while it stands, every output says so. Remove it once you \
     stand behind the prior.",
);

const STUDY: TableInfo = TableInfo {
    not_yet: &[NotYet {
        name: "design",
        what: "the design of the study",
    }],
    ..table(
        "study",
        Times::Once,
        &[
            required(
                "title",
                Kind::Text,
                "\"Grooved decking and falls at ferry landings\"",
                "Title of all outputs.",
            ),
            required(
                "question",
                Kind::Text,
                "\"Do landings with grooved decking have fewer falls per boarding?\"",
                "The board's question, in words.",
            ),
            required(
                "answer",
                Kind::Text,
                "\"decking=grooved\"",
                "The term that answers the question, which is told first: the column of a number, `column=level` of a \
                 category, two of these joined by ` with ` for a joint, or `baseline` for the rate itself.",
            ),
            required(
                "seed",
                Kind::Whole { from: 0, to: i64::MAX },
                "48151",
                "Seed of every random number: the same seed, spec, data and version give the same results to the last \
                 digit.",
            ),
        ],
        "What is asked, and which term answers it.",
    )
};

const DATA: TableInfo = TableInfo {
    not_yet: &[
        NotYet {
            name: "delimiter",
            what: "separators other than the comma",
        },
        NotYet {
            name: "decimal_mark",
            what: "decimal marks other than the point",
        },
        NotYet {
            name: "sheet",
            what: "workbooks",
        },
        NotYet {
            name: "date_format",
            what: "dates",
        },
    ],
    ..table(
        "data",
        Times::Once,
        &[
            required(
                "file",
                Kind::Text,
                "\"landings.csv\"",
                "The table: a CSV file with a header, its path relative to the spec.",
            ),
            required(
                "unit",
                Kind::Text,
                "\"landing\"",
                "Column that names what the rows belong to (a place, a team); predictive checks are per unit.",
            ),
            optional(
                "period",
                Kind::Text,
                "\"month\"",
                "rows of a unit have no order",
                "Column that orders the rows of a unit.",
            ),
            defaulted(
                "rows_with_gaps",
                Kind::Choice(
                    &[
                        Choice {
                            value: "refuse",
                            meaning: "the study is refused, with the list of gaps",
                        },
                        Choice {
                            value: "drop",
                            meaning: "such rows are left out and listed",
                        },
                    ],
                    &[],
                ),
                "\"drop\"",
                DefaultValue::Choice("refuse"),
                "What happens to rows that lack a value which the fit needs.",
            ),
            optional(
                "gap_marks",
                Kind::Texts { at_least: 0 },
                "[\"NA\", \"-\"]",
                "only an empty cell is a gap",
                "Cell texts that mean \"no value\", besides the empty cell.",
            ),
            optional(
                "keep",
                Kind::Keep,
                "{ season = [\"summer\", \"autumn\"], slope_deg = { to = 20 } }",
                "all rows are kept",
                "Only rows that fulfil every condition: one of the listed levels, or a number within `from` and `to`, \
                 both ends included.",
            ),
            optional(
                "stands_for",
                Kind::Text,
                "\"rows\"",
                "every row stands for itself",
                "Column that says how many identical rows this row stands for.",
            ),
        ],
        "Which rows of which table.",
    )
};

/// A range of numbers under `keep` of [data].
pub(super) const KEEP_ENDS: TableInfo = table(
    "keep",
    Times::Inline,
    &[
        optional(
            "from",
            Kind::Number(Bounds::NONE),
            "0",
            "there is no smallest number",
            "Smallest number kept.",
        ),
        optional(
            "to",
            Kind::Number(Bounds::NONE),
            "20",
            "there is no largest number",
            "Largest number kept.",
        ),
    ],
    "Which numbers of a column are kept; one of the keys must stand.",
);

const INCIDENTS: TableInfo = TableInfo {
    not_yet: &[
        NotYet {
            name: "suppressed",
            what: "counts known only as a range",
        },
        NotYet {
            name: "log",
            what: "incidents listed one by one",
        },
        NotYet {
            name: "columns",
            what: "counts in several columns",
        },
    ],
    ..table(
        "incidents",
        Times::Once,
        &[required(
            "column",
            Kind::Text,
            "\"falls\"",
            "Column of the counts: whole numbers from 0.",
        )],
        "What is counted.",
    )
};

const EXPOSURE: TableInfo = table(
    "exposure",
    Times::AtMostOnce,
    &[
        required(
            "column",
            Kind::Text,
            "\"boardings\"",
            "Column of the opportunity for incidents: numbers above 0.",
        ),
        defaulted(
            "per",
            Kind::Number(Bounds::POSITIVE),
            "10000",
            DefaultValue::Number(1.0),
            "Rates are told per this many units of exposure.",
        ),
        defaulted(
            "one_incident_each_at_most",
            Kind::Switch,
            "true",
            DefaultValue::Switch(false),
            "One unit of exposure can bring one incident at most: a count above its exposure is then an error.",
        ),
    ],
    "The opportunity for incidents; without this table every row counts as 1.",
);

const FAMILY: TableInfo = TableInfo {
    decided_by: Some("kind"),
    ..table(
        "family",
        Times::Once,
        &[
            required(
                "kind",
                Kind::Choice(
                    &[
                        Choice {
                            value: "negative-binomial",
                            meaning: "counts scatter more than chance alone",
                        },
                        Choice {
                            value: "poisson",
                            meaning: "counts scatter as chance alone would have it",
                        },
                    ],
                    &[],
                ),
                "\"negative-binomial\"",
                "How counts scatter about their expectation.",
            ),
            only_with(
                &["negative-binomial"],
                required(
                    "scatter_up_to",
                    Kind::Number(Bounds::POSITIVE),
                    "1.0",
                    "Prior of the scatter, the coefficient of variation of the true rate among rows that look alike: \
                     it exceeds this value with probability 0.05.",
                ),
            ),
            only_with(&["negative-binomial"], PROVISIONAL),
        ],
        "How counts scatter about their expectation.",
    )
};

/// `earlier` of [baseline].
pub(super) const EARLIER: TableInfo = table(
    "earlier",
    Times::Inline,
    &[
        required(
            "incidents",
            Kind::Number(Bounds::POSITIVE),
            "12",
            "Incidents seen earlier.",
        ),
        required(
            "exposure",
            Kind::Number(Bounds::POSITIVE),
            "150000",
            "Exposure that they were seen over, in the units of the exposure column (not per `per`).",
        ),
        required(
            "at_reference",
            Kind::Switch,
            "true",
            "Must be `true`: the earlier data were seen where numbers are at their centre and categories at their \
             reference.",
        ),
    ],
    "Earlier data in place of a plausible rate: a gamma prior on the rate.",
);

const BASELINE: TableInfo = TableInfo {
    exactly_one_of: &["plausible_rate", "earlier"],
    ..table(
        "baseline",
        Times::Once,
        &[
            optional(
                "plausible_rate",
                Kind::Range,
                "[0.5, 20.0]",
                "`earlier` must stand instead",
                "Central 95 % of what is believed of the rate, per `per` units of exposure.",
            ),
            optional(
                "earlier",
                Kind::Inline(&EARLIER),
                "{ incidents = 12, exposure = 150000, at_reference = true }",
                "`plausible_rate` must stand instead",
                "Earlier data instead of a range; only for `kind = \"poisson\"`.",
            ),
            PROVISIONAL,
        ],
        "What is believed of the rate where numbers are at their centre and categories at their reference.",
    )
};

const COVARIATE: TableInfo = TableInfo {
    decided_by: Some("as"),
    not_yet: &[
        NotYet {
            name: "cycle",
            what: "seasons",
        },
        NotYet {
            name: "waves",
            what: "seasons",
        },
        NotYet {
            name: "bends",
            what: "curves",
        },
    ],
    ..table(
        "covariate",
        Times::Many,
        &[
            required("column", Kind::Text, "\"decking\"", "The column."),
            required(
                "as",
                Kind::Choice(
                    &[
                        Choice {
                            value: "category",
                            meaning: "each level against the reference",
                        },
                        Choice {
                            value: "number",
                            meaning: "log rate in proportion to the number",
                        },
                        Choice {
                            value: "log-number",
                            meaning: "log rate in proportion to the number's log; the rate ratio is per doubling",
                        },
                    ],
                    &[
                        NotYet {
                            name: "season",
                            what: "seasons",
                        },
                        NotYet {
                            name: "curve",
                            what: "curves",
                        },
                        NotYet {
                            name: "since",
                            what: "change since a date",
                        },
                    ],
                ),
                "\"category\"",
                "How the column enters the model.",
            ),
            only_with(
                &["category"],
                required(
                    "reference",
                    Kind::Text,
                    "\"plain\"",
                    "The level that the others are compared with.",
                ),
            ),
            only_with(
                &["category"],
                optional(
                    "merge",
                    Kind::Merge,
                    "{ other = [\"mesh\", \"paint\"] }",
                    "every level stands for itself",
                    "Levels taken together under a new name, before the reference is looked up.",
                ),
            ),
            only_with(
                &["number", "log-number"],
                required(
                    "centre",
                    Kind::Centre,
                    "8.0",
                    "Where the baseline sits: a value (above 0 for a log-number), or `\"mean\"` over the rows kept, each \
                     row once (the geometric mean for a log-number).",
                ),
            ),
            only_with(
                &["number"],
                required(
                    "step",
                    Kind::Number(Bounds::POSITIVE),
                    "2.0",
                    "The change that the rate ratio stands for.",
                ),
            ),
            required(
                "plausible_ratio",
                Kind::Range,
                "[0.33, 3.0]",
                "Central 95 % of what is believed of each of its rate ratios: each level against the reference, a step of \
                 a number, a doubling of a log-number.",
            ),
            PROVISIONAL,
        ],
        "A column that may go with a different rate.",
    )
};

const JOINT: TableInfo = table(
    "joint",
    Times::Many,
    &[
        required(
            "of",
            Kind::TwoTexts,
            "[\"decking\", \"slope_deg\"]",
            "Columns of two different covariates of the spec.",
        ),
        required(
            "plausible_ratio",
            Kind::Range,
            "[0.5, 2.0]",
            "Central 95 % of what is believed of each of its rate ratios: the factor by which one covariate's rate ratio \
             changes with the other.",
        ),
        PROVISIONAL,
    ],
    "An interaction: the rate ratio of one covariate may differ with another.",
);

const SAMPLING: TableInfo = table(
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
                    Choice {
                        value: "mixed",
                        meaning: "independence Metropolis steps mixed with random-walk Metropolis steps",
                    },
                    Choice {
                        value: "walk",
                        meaning: "random-walk Metropolis steps alone: slow, an independent route to the same answer",
                    },
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

const REPORT: TableInfo = TableInfo {
    not_yet: &[NotYet {
        name: "accept",
        what: "accepted checks",
    }],
    ..table(
        "report",
        Times::AtMostOnce,
        &[
            defaulted(
                "interval",
                Kind::Number(Bounds {
                    lower: End::Excluded(0.0),
                    upper: End::Excluded(1.0),
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
