//! The model and what is believed of it: `[family]`, `[baseline]`, `[[covariate]]`, `[[joint]]`.

use super::build::{choice, defaulted, not_yet, only_with, optional, required, table};
use crate::spec::keys::{Bounds, DefaultValue, End, KeyInfo, Kind, TableInfo, Times};

/// `provisional`, which may stand beside every prior.
const PROVISIONAL: KeyInfo = defaulted(
    "provisional",
    Kind::Switch,
    "true",
    DefaultValue::Switch(false),
    "Marks a prior that nobody has thought about yet; while it stands, every output says so. Remove it once you \
     stand behind the prior.",
);

pub(super) const FAMILY: TableInfo = TableInfo {
    decided_by: Some("kind"),
    ..table(
        "family",
        Times::Once,
        &[
            required(
                "kind",
                Kind::Choice(
                    &[
                        choice("negative-binomial", "counts scatter more than chance alone"),
                        choice("poisson", "counts scatter as chance alone would have it"),
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
                    Kind::Number(SCATTERS),
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

/// A scatter of 0.0001 no count can tell from none, and one of 100 no table has: beyond them the
/// key was misunderstood.
const SCATTERS: Bounds = Bounds {
    lower: End::Included(1e-4),
    upper: End::Included(100.0),
};

/// `earlier` of [baseline].
pub(in crate::spec) const EARLIER: TableInfo = table(
    "earlier",
    Times::Inline,
    &[
        required(
            "incidents",
            Kind::Number(Bounds {
                lower: End::Excluded(0.0),
                upper: End::Included(1e9),
            }),
            "12",
            "Incidents seen earlier.",
        ),
        required(
            "exposure",
            Kind::Number(Bounds {
                lower: End::Included(1e-9),
                upper: End::Included(1e15),
            }),
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

pub(super) const BASELINE: TableInfo = TableInfo {
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

pub(super) const COVARIATE: TableInfo = TableInfo {
    decided_by: Some("as"),
    not_yet: &[
        not_yet("cycle", "seasons"),
        not_yet("waves", "seasons"),
        not_yet("bends", "curves"),
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
                        choice("category", "each level against the reference"),
                        choice("number", "log rate in proportion to the number"),
                        choice(
                            "log-number",
                            "log rate in proportion to the number's log; the rate ratio is per doubling",
                        ),
                    ],
                    &[
                        not_yet("season", "seasons"),
                        not_yet("curve", "curves"),
                        not_yet("since", "change since a date"),
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

pub(super) const JOINT: TableInfo = table(
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
