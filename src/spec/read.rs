//! From a file or a text to a checked [`Spec`], or to all that is wrong with it.

use std::io::Read;
use std::ops::Range;
use std::path::Path;

use toml::de::{DeTable, DeValue};

use super::cross::{check_answer, check_counts_column, check_period, check_terms};
use super::fault::{Encoding, KeyHint, SpecError, SpecFault};
use super::fields::{Faults, Fields};
use super::keys::{TableInfo, Times};
use super::predictor::{CovariateDraft, JointDraft, read_covariate, read_joint};
use super::sections::{
    read_baseline, read_data, read_exposure, read_family, read_incidents, read_report, read_sampling, read_study,
};
use super::study::{At, Source, Spec};
use super::tables::{TABLES, TABLES_NOT_YET};
use super::values::type_in_words;
use crate::diagnostic::nearest;
use crate::regular_file;

/// The largest spec that is read, in bytes. A table named where the spec is meant would otherwise be
/// taken in whole, only to be refused line by line.
pub const MOST_BYTES: u64 = 1 << 20;

/// Bytes of a file that is too large that are looked at.
const LOOKED_AT: usize = 4096;

/// Reads and checks a spec file.
///
/// # Errors
/// The file cannot be read, is larger than [`MOST_BYTES`], is not UTF-8 (a byte-order mark of UTF-8 is accepted), or [`parse`]
/// refuses its text.
pub fn read(path: &Path) -> Result<Spec, SpecError> {
    let file = path.display().to_string();
    let refuse = |fault| SpecError {
        source: Source {
            file: file.clone(),
            text: String::new(),
        },
        faults: vec![fault],
    };
    let mut bytes = Vec::new();
    regular_file::open(path)
        .and_then(|file| file.take(MOST_BYTES + 1).read_to_end(&mut bytes))
        .map_err(|error| {
            refuse(SpecFault::Unreadable {
                reason: error.to_string(),
            })
        })?;
    if bytes.len() as u64 > MOST_BYTES {
        let start = String::from_utf8_lossy(&bytes[..LOOKED_AT]);
        return Err(refuse(if looks_like_table(&file, &start) {
            SpecFault::IsTable
        } else {
            SpecFault::TooLarge
        }));
    }
    match String::from_utf8(bytes) {
        Ok(text) => parse(&file, &text),
        Err(error) if looks_like_table(&file, &String::from_utf8_lossy(error.as_bytes())) => {
            Err(refuse(SpecFault::IsTable))
        }
        Err(error) => {
            let offset = error.utf8_error().valid_up_to();
            let bytes = error.as_bytes();
            Err(refuse(SpecFault::NotUtf8 {
                line: 1 + bytes[..offset].iter().filter(|byte| **byte == b'\n').count(),
                offset,
                looks_like: if bytes.starts_with(&[0xFF, 0xFE]) || bytes.starts_with(&[0xFE, 0xFF]) {
                    Encoding::Utf16
                } else {
                    Encoding::Other
                },
            }))
        }
    }
}

/// Checks the text of a spec; `file` is only the name that messages give.
///
/// # Errors
/// The text is not TOML: then the errors of syntax alone. Else every key, value and relation
/// between them that is at fault, in the order of the text. What only the data can tell (a column
/// that the table lacks, a level that never occurs) is left to `design`.
pub fn parse(file: &str, text: &str) -> Result<Spec, SpecError> {
    let source = Source {
        file: file.to_string(),
        text: text.to_string(),
    };
    let (root, errors) = DeTable::parse_recoverable(text);
    if !errors.is_empty() && looks_like_table(file, text) {
        return Err(refusal(source, vec![SpecFault::IsTable]));
    }
    if !errors.is_empty() {
        let faults = errors.iter().map(|error| SpecFault::Syntax {
            what: error.message().to_string(),
            span: error.span().unwrap_or(text.len()..text.len()),
        });
        return Err(refusal(source, faults.collect()));
    }
    let root = root.into_inner();
    if root.is_empty() {
        return Err(refusal(source, vec![SpecFault::Empty]));
    }
    let mut faults = Vec::new();
    match read_root(&source, &root, &mut faults) {
        Some(spec) if faults.is_empty() => Ok(spec),
        _ => Err(refusal(source, faults)),
    }
}

/// Whether what is no TOML is a table that was named in place of the spec: by the ending of its
/// name, or by a first line of several cells. A line that begins as a spec's does is none of a
/// table, whatever the name.
fn looks_like_table(file: &str, text: &str) -> bool {
    const ENDINGS: [&str; 7] = ["csv", "tsv", "parquet", "arrow", "feather", "xlsx", "xls"];
    let first = text
        .trim_start_matches('\u{feff}')
        .lines()
        .map(str::trim)
        .find(|line| !line.is_empty())
        .unwrap_or_default();
    if first.starts_with(['#', '[']) || first.contains('=') {
        return false;
    }
    let ending = Path::new(file).extension().and_then(|ending| ending.to_str());
    let named = ending.is_some_and(|ending| ENDINGS.iter().any(|known| ending.eq_ignore_ascii_case(known)));
    let is_name = |cell: &str| !cell.trim().is_empty() && !cell.contains(['{', '}', ']']);
    let cells = |separator: char| first.contains(separator) && first.split(separator).all(is_name);
    named || [',', ';', '\t'].into_iter().any(cells)
}

/// Puts the faults into the order of the text.
fn refusal(source: Source, mut faults: Vec<SpecFault>) -> SpecError {
    faults.sort_by_key(SpecFault::start);
    SpecError { source, faults }
}

/// Reads every table before it gives up on any.
fn read_root(source: &Source, root: &DeTable<'_>, faults: &mut Faults) -> Option<Spec> {
    tell_unknown_tables(root, faults);
    let tables = Tables {
        root,
        nothing: &DeTable::new(),
        text: &source.text,
    };
    let study = tables
        .one("study", faults)
        .and_then(|fields| read_study(&fields, faults));
    let data = tables.one("data", faults).and_then(|fields| read_data(&fields, faults));
    let incidents = tables
        .one("incidents", faults)
        .and_then(|fields| read_incidents(&fields, faults));
    let exposure = tables
        .one("exposure", faults)
        .map(|fields| read_exposure(&fields, faults));
    let family = tables
        .one("family", faults)
        .map(|fields| read_family(&fields, faults))
        .unwrap_or_default();
    let baseline = tables
        .one("baseline", faults)
        .and_then(|fields| read_baseline(&fields, family.kind, faults));
    let covariates = tables.many("covariate", faults, read_covariate);
    let joints = tables.many("joint", faults, read_joint);
    let sampling = tables
        .or_defaults("sampling", faults)
        .and_then(|fields| read_sampling(&fields, faults));
    let report = tables
        .or_defaults("report", faults)
        .and_then(|fields| read_report(&fields, faults));

    check_terms(&covariates, &joints, faults);
    let exposure_read = exposure.as_ref().and_then(Option::as_ref);
    check_counts_column(incidents.as_ref(), exposure_read, data.as_ref(), &covariates, faults);
    check_period(data.as_ref(), faults);
    if let Some(study) = &study {
        check_answer(&study.answer, &covariates, &joints, faults);
    }
    Some(Spec {
        source: source.clone(),
        study: study?,
        data: data?,
        incidents: incidents?,
        exposure: match exposure {
            Some(read) => Some(read?),
            None => None,
        },
        family: family.family?,
        baseline: baseline?,
        covariates: covariates
            .into_iter()
            .map(CovariateDraft::finish)
            .collect::<Option<_>>()?,
        joints: joints.into_iter().map(JointDraft::finish).collect::<Option<_>>()?,
        sampling: sampling?,
        report: report?,
    })
}

/// The tables of a spec, by name.
struct Tables<'a> {
    root: &'a DeTable<'a>,
    /// Stands in for a table that was left out and of which every key has a default.
    nothing: &'a DeTable<'a>,
    text: &'a str,
}

impl<'a> Tables<'a> {
    /// A table that stands once; tells one that is required and missing.
    fn one(&self, name: &str, faults: &mut Faults) -> Option<Fields<'a>> {
        let info = info_of(name)?;
        match self.root.get(name) {
            Some(value) => match value.get_ref() {
                DeValue::Table(table) => Some(Fields::open(info, table, value.span(), self.text, faults)),
                other => {
                    faults.push(wrong_shape(info, other, value.span()));
                    None
                }
            },
            None => {
                // A table that stands misspelt has been told already.
                let misspelt = self
                    .root
                    .keys()
                    .any(|key| info_of(key.get_ref()).is_none() && meant(key.get_ref()) == Some(name));
                if info.times == Times::Once && !misspelt {
                    faults.push(SpecFault::MissingTable { table: info.heading() });
                }
                None
            }
        }
    }

    /// A table that may be left out, since every key of it has a default.
    fn or_defaults(&self, name: &str, faults: &mut Faults) -> Option<Fields<'a>> {
        if self.root.contains_key(name) {
            return self.one(name, faults);
        }
        Some(Fields::open(info_of(name)?, self.nothing, 0..0, self.text, faults))
    }

    /// Every table of a name that may stand many times, in the order of the spec.
    fn many<T>(&self, name: &str, faults: &mut Faults, read: impl Fn(&Fields<'a>, &mut Faults) -> T) -> Vec<T> {
        let (Some(info), Some(value)) = (info_of(name), self.root.get(name)) else {
            return Vec::new();
        };
        let DeValue::Array(array) = value.get_ref() else {
            faults.push(wrong_shape(info, value.get_ref(), value.span()));
            return Vec::new();
        };
        let mut found = Vec::new();
        for item in array.iter() {
            match item.get_ref() {
                DeValue::Table(table) => {
                    let fields = Fields::open(info, table, item.span(), self.text, faults);
                    found.push(read(&fields, faults));
                }
                other => faults.push(wrong_shape(info, other, item.span())),
            }
        }
        found
    }
}

fn info_of(name: &str) -> Option<&'static TableInfo> {
    TABLES.iter().find(|info| info.name == name)
}

/// The table that is spelt like an unknown name.
fn meant(name: &str) -> Option<&'static str> {
    nearest(name, TABLES.iter().map(|table| table.name))
}

/// `[covariate]` for `[[covariate]]`, `study = 3` for `[study]`.
fn wrong_shape(info: &TableInfo, found: &DeValue<'_>, span: Range<usize>) -> SpecFault {
    SpecFault::WrongType {
        key: format!("`{}`", info.name),
        wanted: match info.times {
            Times::Many => format!("tables under the heading {}", info.heading()),
            _ => format!("one table under the heading {}", info.heading()),
        },
        found: type_in_words(found),
        span,
    }
}

/// Tells what stands at the top of the spec and is no table of it.
fn tell_unknown_tables(root: &DeTable<'_>, faults: &mut Faults) {
    for (key, value) in root.iter() {
        let name = key.get_ref().as_ref();
        if info_of(name).is_some() {
            continue;
        }
        if let Some(planned) = TABLES_NOT_YET.iter().find(|planned| planned.name == name) {
            let heading = if matches!(value.get_ref(), DeValue::Array(_)) {
                format!("[[{name}]]")
            } else {
                format!("[{name}]")
            };
            faults.push(SpecFault::NotYet {
                part: format!("`{heading}`"),
                what: planned.what,
                span: key.span(),
            });
            continue;
        }
        let hint = match TABLES.iter().find(|table| table.key(name).is_some()) {
            Some(table) => KeyHint::BelongsTo(table.heading()),
            None => match meant(name) {
                Some(near) => KeyHint::Nearest(near),
                None => KeyHint::Nothing,
            },
        };
        faults.push(SpecFault::UnknownKey {
            table: None,
            key: At {
                value: name.to_string(),
                span: key.span(),
            },
            hint,
        });
    }
}
