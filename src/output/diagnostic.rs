//! Problems in words and places, for a terminal, a log or a screen reader.
//!
//! Nothing depends on colour or boxes: every line reads on its own, and lines of ours stay within
//! `WIDTH` columns. A place in the spec shows its line with the characters marked.

use std::ops::Range;

use annotate_snippets::renderer::DecorStyle;
use annotate_snippets::{AnnotationKind, Group, Level, Renderer, Snippet};
use anstyle::{Effects, Style};

use crate::diagnostic::{Diagnostic, Place};
use crate::output::text::is_unseen;
use crate::spec::Source;

/// Columns that text of ours is wrapped to.
const WIDTH: usize = 78;

/// Characters of a cell that are shown.
const VALUE_SHOWN: usize = 40;

/// How problems look.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Look {
    /// Text alone.
    Plain,
    /// Bold headings and coloured marks, as escape sequences; for a terminal that shows them.
    Styled,
}

/// The problems as text, each with its code, its places and what to do, an empty line between.
///
/// `spec_source` is the text that places in the spec point into; without it they are named by
/// their file alone.
pub fn render(diagnostics: &[Diagnostic], spec_source: Option<&Source>, look: Look) -> String {
    let told: Vec<String> = diagnostics
        .iter()
        .map(|diagnostic| one(diagnostic, spec_source, look))
        .collect();
    told.join("\n")
}

fn one(diagnostic: &Diagnostic, spec_source: Option<&Source>, look: Look) -> String {
    let mut out = String::new();
    let message = format!("{} ({})", diagnostic.message, diagnostic.code);
    out.push_str(&paragraph("Problem:", &message, look));
    for place in &diagnostic.places {
        out.push_str(&match (place, spec_source) {
            (Place::Spec { span, label, .. }, Some(source)) => marked_line(source, span, label, look),
            _ => wrapped(&place_in_words(place), "  ", "    "),
        });
    }
    let more = diagnostic.places_in_all.saturating_sub(diagnostic.places.len());
    if more > 0 {
        out.push_str(&format!(
            "  and {more} more {}\n",
            if more == 1 { "place" } else { "places" }
        ));
    }
    out.push_str(&paragraph("What to do:", &diagnostic.help, look));
    out
}

/// A place without its text: `landings.csv, line 17, column "falls": value "-3"`.
fn place_in_words(place: &Place) -> String {
    match place {
        Place::File { file } => format!("in {file}"),
        Place::Spec { file, label, .. } if label.is_empty() => format!("in {file}"),
        Place::Spec { file, label, .. } => format!("in {file}: {label}"),
        Place::Cell {
            file,
            line,
            column,
            value,
        } => {
            let mut words = file.clone();
            if let Some(line) = line {
                words.push_str(&format!(", line {line}"));
            }
            if let Some(column) = column {
                words.push_str(&format!(", column \"{}\"", shortened(column)));
            }
            if let Some(value) = value {
                words.push_str(&format!(": value \"{}\"", shortened(value)));
            }
            words
        }
    }
}

/// The line of a place in the spec, its characters marked and the label beside them.
fn marked_line(source: &Source, span: &Range<usize>, label: &str, look: Look) -> String {
    // An editor counts columns without the byte-order mark.
    let mark = if source.text.starts_with('\u{feff}') {
        '\u{feff}'.len_utf8()
    } else {
        0
    };
    let text = &source.text[mark..];
    let span = within_one_line(text, span.start.saturating_sub(mark)..span.end.saturating_sub(mark));
    let line_start = text[..span.start].rfind('\n').map_or(0, |newline| newline + 1);
    let column = text[line_start..span.end].chars().count();
    let label = clean(label);
    // Beside marks that stand far to the right a label would leave the window: it gets its own line.
    let fits = column + label.chars().count() + 8 <= WIDTH;
    let annotation = AnnotationKind::Primary.span(span);
    let annotation = if fits && !label.is_empty() {
        annotation.label(label.as_str())
    } else {
        annotation
    };
    let snippet = Snippet::source(text).path(clean(&source.file)).annotation(annotation);
    let renderer = match look {
        Look::Plain => Renderer::plain(),
        Look::Styled => Renderer::styled().hyperlink(false),
    };
    let renderer = renderer.term_width(WIDTH).decor_style(DecorStyle::Ascii);
    let mut out = renderer.render(&[Group::with_level(Level::ERROR).element(snippet)]);
    out.push('\n');
    if !fits {
        out.push_str(&wrapped(&label, "    ", "    "));
    }
    out
}

/// A span that lies in the text, on the borders of characters and within one line: a list over
/// many lines is marked on its first.
fn within_one_line(text: &str, span: Range<usize>) -> Range<usize> {
    let mut start = span.start.min(text.len());
    while !text.is_char_boundary(start) {
        start -= 1;
    }
    let mut end = span.end.clamp(start, text.len());
    while !text.is_char_boundary(end) {
        end -= 1;
    }
    let line_end = text[start..end]
        .find(['\n', '\r'])
        .map_or(end, |newline| start + newline);
    start..line_end
}

/// A heading and its text, wrapped.
fn paragraph(heading: &str, text: &str, look: Look) -> String {
    let plain = wrapped(&format!("{heading} {}", clean(text)), "", "  ");
    match look {
        Look::Plain => plain,
        Look::Styled => {
            let bold = Style::new().effects(Effects::BOLD);
            plain.replacen(heading, &format!("{bold}{heading}{bold:#}"), 1)
        }
    }
}

/// Words in lines of at most [`WIDTH`] columns (a longer word stands alone), each ended.
fn wrapped(text: &str, first: &str, others: &str) -> String {
    let mut out = String::new();
    let mut line = String::from(first);
    let mut empty = true;
    for word in clean(text).split(' ') {
        if !empty && line.chars().count() + 1 + word.chars().count() > WIDTH {
            out.push_str(line.trim_end());
            out.push('\n');
            line = String::from(others);
            empty = true;
        }
        if !empty {
            line.push(' ');
        }
        line.push_str(word);
        empty = false;
    }
    out.push_str(line.trim_end());
    out.push('\n');
    out
}

/// The start of a text, where it is long.
fn shortened(text: &str) -> String {
    match text.char_indices().nth(VALUE_SHOWN) {
        Some((end, _)) => format!("{}…", &text[..end]),
        None => text.to_string(),
    }
}

/// Control characters written out: a file handed in must not steer the terminal.
fn clean(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for letter in text.chars() {
        if is_unseen(letter) {
            out.extend(letter.escape_default());
        } else {
            out.push(letter);
        }
    }
    out
}
