//! What is asked of which rows: `[study]`, `[data]`, `[incidents]`, `[exposure]`.

use super::build::{choice, defaulted, not_yet, optional, required, table};
use crate::spec::keys::{Bounds, DefaultValue, Kind, TableInfo, Times};

pub(super) const STUDY: TableInfo = TableInfo {
    not_yet: &[not_yet("design", "the design of the study")],
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

pub(super) const DATA: TableInfo = TableInfo {
    not_yet: &[
        not_yet("delimiter", "separators other than the comma"),
        not_yet("decimal_mark", "decimal marks other than the point"),
        not_yet("sheet", "workbooks"),
        not_yet("date_format", "dates"),
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
                        choice("refuse", "the study is refused, with the list of gaps"),
                        choice("drop", "such rows are left out and listed"),
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
pub(in crate::spec) const KEEP_ENDS: TableInfo = table(
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

pub(super) const INCIDENTS: TableInfo = TableInfo {
    not_yet: &[
        not_yet("suppressed", "counts known only as a range"),
        not_yet("log", "incidents listed one by one"),
        not_yet("columns", "counts in several columns"),
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

pub(super) const EXPOSURE: TableInfo = table(
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
