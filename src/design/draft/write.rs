//! The text of a draft.

use super::entries::{Entry, EntryKind, LeftOut};
use super::look::Facts;
use super::roles::Roles;
use crate::table::Table;
use std::fmt::Write;

/// The rate per this many units is told with at least one digit before the point, up to here.
const LARGEST_PER: f64 = 1e9;

/// How many other terms are offered as the answer.
const OTHER_ANSWERS: usize = 12;

/// All that a draft is written from.
pub(super) struct Sheet<'a> {
    pub table: &'a Table,
    pub facts: &'a [Facts<'a>],
    pub roles: &'a Roles,
    pub entries: &'a [Entry],
    pub left_out: &'a [LeftOut],
}

impl Sheet<'_> {
    /// The spec, with the first of `terms` as its answer, or the baseline where there is none.
    pub fn text(&self, terms: &[String]) -> String {
        let mut text = String::new();
        // Writing to a string cannot fail.
        let _ = self.write(&mut text, terms);
        text
    }

    fn write(&self, text: &mut String, terms: &[String]) -> std::fmt::Result {
        self.study(text, terms)?;
        self.data(text)?;
        let (per, rate) = self.rate();
        self.counts(text, per)?;
        writeln!(text, "\n[family]")?;
        writeln!(text, "kind = \"negative-binomial\"")?;
        writeln!(
            text,
            "scatter_up_to = 1.0 # how much alike rows may differ in their true rate; 1.0 is a lot"
        )?;
        writeln!(text, "provisional = true")?;
        writeln!(text, "\n[baseline]")?;
        let (lo, hi) = (two_digits(rate / 30.0), two_digits(rate * 30.0));
        writeln!(
            text,
            "# A thirtieth to thirty times the rate of the whole table, {}: say what you believe instead.",
            two_digits(rate)
        )?;
        writeln!(text, "plausible_rate = [{lo}, {hi}]")?;
        writeln!(text, "provisional = true")?;
        for entry in self.entries {
            covariate(text, entry)?;
        }
        if !self.left_out.is_empty() {
            writeln!(text, "\n# Columns left out:")?;
            for column in self.left_out {
                writeln!(text, "# - {}: {}", quoted(&column.column), one_line(&column.because))?;
            }
        }
        Ok(())
    }

    fn study(&self, text: &mut String, terms: &[String]) -> std::fmt::Result {
        let file = &self.table.file;
        let counts = self.facts[self.roles.incidents].name();
        writeln!(
            text,
            "# A starter spec, drafted from {} alone. Every line is a guess: read each, correct it,",
            quoted(file)
        )?;
        writeln!(
            text,
            "# and narrow each plausible range to what is believed before the data are seen; then take"
        )?;
        writeln!(text, "# its `provisional = true` out.\n")?;
        writeln!(text, "[study]")?;
        writeln!(
            text,
            "title = {}",
            quoted(&format!(
                "{counts} in {}",
                file.rsplit(['/', '\\']).next().unwrap_or(file)
            ))
        )?;
        let question = match terms.first() {
            Some(term) => format!("Does the rate of {counts} go with {term}?"),
            None => format!("What is the rate of {counts}?"),
        };
        writeln!(text, "question = {}", quoted(&question))?;
        match terms {
            [] => writeln!(text, "answer = \"baseline\"")?,
            [first, others @ ..] => {
                writeln!(
                    text,
                    "answer = {} # choose the term that answers the question",
                    quoted(first)
                )?;
                for other in others.iter().take(OTHER_ANSWERS) {
                    writeln!(text, "# or: {}", quoted(other))?;
                }
            }
        }
        writeln!(text, "seed = 1 # any whole number; the same seed gives the same digits")
    }

    fn data(&self, text: &mut String) -> std::fmt::Result {
        let unit = &self.facts[self.roles.unit];
        writeln!(text, "\n[data]")?;
        writeln!(text, "file = {}", quoted(&self.table.file))?;
        let units = match unit.levels.len() {
            many if many > 1000 => "more than 1,000".to_owned(),
            units => units.to_string(),
        };
        writeln!(
            text,
            "unit = {} # what a row belongs to; {units} of them",
            quoted(unit.name())
        )?;
        if let Some(period) = self.roles.period {
            writeln!(
                text,
                "period = {} # orders the rows of a unit",
                quoted(self.facts[period].name())
            )?;
        }
        let with_gaps: Vec<&Facts> = self.used().filter(|facts| facts.gaps > 0).collect();
        if with_gaps.is_empty() {
            writeln!(text, "rows_with_gaps = \"refuse\"")?;
        } else {
            writeln!(
                text,
                "# Rows with gaps are left out and listed. Do they differ from the others? Gaps:"
            )?;
            for facts in &with_gaps {
                writeln!(
                    text,
                    "# - {}: {} of {} rows",
                    quoted(facts.name()),
                    facts.gaps,
                    self.table.rows()
                )?;
            }
            writeln!(text, "rows_with_gaps = \"drop\"")?;
        }
        let mut marks: Vec<&str> = with_gaps
            .iter()
            .flat_map(|facts| facts.gap_marks(self.table.rows()))
            .collect();
        marks.sort_unstable();
        marks.dedup();
        if !marks.is_empty() {
            let marks: Vec<String> = marks.into_iter().map(quoted).collect();
            writeln!(
                text,
                "gap_marks = [{}] # texts that mean \"no value\"",
                marks.join(", ")
            )?;
        }
        self.keep(text)
    }

    /// Rows without exposure tell nothing; those among them with incidents are a mistake, which a
    /// draft must leave to the evaluator and say aloud.
    fn keep(&self, text: &mut String) -> std::fmt::Result {
        let Some(exposure) = self.roles.exposure.map(|place| &self.facts[place]) else {
            return Ok(());
        };
        let Some(numbers) = exposure.numbers.as_ref().filter(|numbers| numbers.least == 0.0) else {
            return Ok(());
        };
        let (mut without, mut mistaken) = (0, 0);
        for row in 0..self.table.rows() {
            if exposure.column.number(row) == Some(0.0) {
                without += 1;
                let counted = self.facts[self.roles.incidents].column.number(row);
                mistaken += usize::from(counted.is_some_and(|count| count > 0.0));
            }
        }
        writeln!(
            text,
            "# Rows with an exposure of 0 tell nothing about the rate and are left out: {without}."
        )?;
        if mistaken > 0 {
            writeln!(
                text,
                "# Of them with incidents all the same: {mistaken}. Correct those before you believe any result."
            )?;
        }
        writeln!(
            text,
            "keep = {{ {} = {{ from = {} }} }}",
            quoted(exposure.name()),
            numbers.least_positive
        )
    }

    fn counts(&self, text: &mut String, per: f64) -> std::fmt::Result {
        writeln!(text, "\n[incidents]")?;
        let named = if self.roles.incidents_named {
            ""
        } else {
            " # a guess: whole numbers from 0; no column name says more"
        };
        writeln!(
            text,
            "column = {}{named}",
            quoted(self.facts[self.roles.incidents].name())
        )?;
        match self.roles.exposure {
            Some(place) => {
                writeln!(text, "\n[exposure]")?;
                writeln!(
                    text,
                    "column = {} # the opportunity for incidents",
                    quoted(self.facts[place].name())
                )?;
                writeln!(text, "per = {per} # rates are told per this many")
            }
            None => {
                writeln!(
                    text,
                    "\n# No column looks like an exposure: every row counts as 1. If one measures the"
                )?;
                writeln!(
                    text,
                    "# opportunity for incidents, name it in an [exposure] table: column = \"…\", per = 1000"
                )
            }
        }
    }

    /// Rates are told per a power of ten that gives a rate of at least 1, and the rate of the
    /// whole table per that many; with no incident at all, as if there had been half of one.
    fn rate(&self) -> (f64, f64) {
        let incidents = &self.facts[self.roles.incidents];
        let exposure = self.roles.exposure.map(|place| &self.facts[place]);
        let (mut counted, mut exposed) = (0.0, 0.0);
        for row in 0..self.table.rows() {
            let count = incidents.column.number(row).filter(|count| count.is_finite());
            let chance = match exposure {
                Some(facts) => facts
                    .column
                    .number(row)
                    .filter(|chance| chance.is_finite() && *chance > 0.0),
                None => Some(1.0),
            };
            if let (Some(count), Some(chance)) = (count, chance) {
                counted += count;
                exposed += chance;
            }
        }
        let rate = if counted > 0.0 { counted } else { 0.5 } / if exposed > 0.0 { exposed } else { 1.0 };
        let mut per = 1.0;
        while exposure.is_some() && rate * per < 1.0 && per < LARGEST_PER {
            per *= 10.0;
        }
        (per, rate * per)
    }

    /// The columns that the draft uses.
    fn used(&self) -> impl Iterator<Item = &Facts<'_>> {
        let roles = self.roles;
        self.facts.iter().enumerate().filter_map(move |(place, facts)| {
            let has_role = place == roles.incidents
                || place == roles.unit
                || Some(place) == roles.exposure
                || Some(place) == roles.period;
            let covariate = self.entries.iter().any(|entry| entry.column == facts.name());
            (has_role || covariate).then_some(facts)
        })
    }
}

fn covariate(text: &mut String, entry: &Entry) -> std::fmt::Result {
    writeln!(text, "\n[[covariate]]")?;
    writeln!(text, "column = {} # {}", quoted(&entry.column), entry.comment)?;
    match &entry.kind {
        EntryKind::Category { reference } => {
            writeln!(text, "as = \"category\"")?;
            writeln!(text, "reference = {}", quoted(reference))?;
        }
        EntryKind::Number { centre, step } => {
            writeln!(text, "as = \"number\"")?;
            writeln!(text, "centre = {centre}")?;
            writeln!(text, "step = {step} # the change that the rate ratio stands for")?;
        }
        EntryKind::LogNumber => {
            writeln!(text, "as = \"log-number\"")?;
            writeln!(text, "centre = \"mean\"")?;
        }
    }
    writeln!(text, "plausible_ratio = [0.2, 5.0]")?;
    writeln!(text, "provisional = true")
}

/// A number to two digits, as TOML reads it.
fn two_digits(number: f64) -> f64 {
    format!("{number:.1e}").parse().unwrap_or(number)
}

/// A TOML string on one line; in comments too, so that a line break in a name ends no comment.
fn quoted(text: &str) -> String {
    format!("\"{}\"", one_line(text))
}

fn one_line(text: &str) -> String {
    let mut escaped = String::new();
    for sign in text.chars() {
        match sign {
            '"' => escaped.push_str("\\\""),
            '\\' => escaped.push_str("\\\\"),
            '\n' => escaped.push_str("\\n"),
            '\r' => escaped.push_str("\\r"),
            '\t' => escaped.push_str("\\t"),
            sign if sign.is_control() || turns_text(sign) => escaped.push_str(&format!("\\u{:04X}", sign as u32)),
            sign => escaped.push(sign),
        }
    }
    escaped
}

/// Whether a character changes the order or the line in which what follows it is shown, so that a
/// comment could be made to look like a key.
fn turns_text(sign: char) -> bool {
    matches!(sign, '\u{61C}' | '\u{200E}' | '\u{200F}' | '\u{2028}'..='\u{202E}' | '\u{2066}'..='\u{2069}' | '\u{FEFF}')
}
