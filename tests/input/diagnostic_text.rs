//! How problems with a table, and of places in a spec, read on a terminal.

use ratewright::diagnostic::{Diagnostic, Place};
use ratewright::output::diagnostic::{Look, render};
use ratewright::spec::Source;

fn cell(line: u64, value: &str) -> Place {
    Place::Cell {
        file: "landings.csv".into(),
        line: Some(line),
        column: Some("falls".into()),
        value: Some(value.into()),
    }
}

fn plain(diagnostic: Diagnostic) -> String {
    render(&[diagnostic], None, Look::Plain)
}

#[test]
fn cells_are_listed_line_by_line_and_the_rest_is_counted() {
    let places = (0..12).map(|i| cell(17 + i, "-3")).collect();
    let text = plain(Diagnostic::new(
        "negative-count",
        "12 counts are below 0",
        places,
        "Correct them.",
    ));
    let lines: Vec<&str> = text.lines().collect();
    assert_eq!(lines[0], "Problem: 12 counts are below 0 (negative-count)");
    assert_eq!(lines[1], "  landings.csv, line 17, column \"falls\": value \"-3\"");
    assert_eq!(lines[10], "  landings.csv, line 26, column \"falls\": value \"-3\"");
    assert_eq!(&lines[11..], ["  and 2 more places", "What to do: Correct them."]);
}

#[test]
fn a_place_names_only_what_is_at_fault() {
    let column = Place::Cell {
        file: "landings.csv".into(),
        line: None,
        column: Some("fals".into()),
        value: None,
    };
    let row = Place::Cell {
        file: "landings.csv".into(),
        line: Some(3),
        column: None,
        value: None,
    };
    let file = Place::File {
        file: "landings.csv".into(),
    };
    let text = plain(Diagnostic::new("c", "m", vec![column, row, file], "h"));
    assert_eq!(
        text,
        "Problem: m (c)\n  landings.csv, column \"fals\"\n  landings.csv, line 3\n  in landings.csv\nWhat to do: h\n"
    );
}

#[test]
fn a_cell_cannot_steer_the_terminal_or_flood_it() {
    let text = plain(Diagnostic::new(
        "c",
        "m\u{7}",
        vec![cell(2, "\u{1b}[31m\nx"), cell(3, &"9".repeat(500))],
        "h",
    ));
    assert!(text.contains("value \"\\u{1b}[31m\\nx\""), "{text}");
    assert!(text.contains(&format!("\"{}…\"", "9".repeat(40))), "{text}");
    assert!(!text.chars().any(|letter| letter.is_control() && letter != '\n'));
}

#[test]
fn long_messages_are_wrapped_and_problems_stand_apart() {
    let long = Diagnostic::new(
        "c",
        "word ".repeat(40).trim_end(),
        vec![],
        "advice ".repeat(30).trim_end(),
    );
    let text = render(&[long.clone(), long], None, Look::Plain);
    assert!(text.lines().all(|line| line.chars().count() <= 78), "{text}");
    assert_eq!(text.matches("\n\n").count(), 1);
    assert_eq!(text.matches("word").count(), 80);
    assert!(
        text.lines()
            .all(|line| line.is_empty() || line.starts_with(['P', 'W']) || line.starts_with("  "))
    );
}

#[test]
fn places_of_the_spec_are_counted_in_letters_and_without_the_byte_order_mark() {
    let text = "\u{feff}größe = \"ä\" # ü\nlist = [\n  1,\n]\n".to_string();
    let source = Source {
        file: "s.toml".into(),
        text,
    };
    let place = |what: &str, label: &str| {
        let start = source.text.find(what).expect("stands");
        Place::Spec {
            file: "s.toml".into(),
            span: start..start + what.len(),
            label: label.into(),
        }
    };
    let places = vec![
        place("größe", "first"),
        place("\"ä\"", "second"),
        place("[\n  1,\n]", "third"),
    ];
    let told = render(&[Diagnostic::new("c", "m", places, "h")], Some(&source), Look::Plain);
    assert_eq!(
        told,
        "Problem: m (c)\n \
         --> s.toml:1:1\n  \
         |\n\
         1 | größe = \"ä\" # ü\n  \
         | ^^^^^ first\n \
         --> s.toml:1:9\n  \
         |\n\
         1 | größe = \"ä\" # ü\n  \
         |         ^^^ second\n \
         --> s.toml:2:8\n  \
         |\n\
         2 | list = [\n  \
         |        ^ third\n\
         What to do: h\n"
    );
}

#[test]
fn a_place_beyond_the_text_is_shown_at_its_end() {
    let source = Source {
        file: "s.toml".into(),
        text: "a = 1".into(),
    };
    let place = Place::Spec {
        file: "s.toml".into(),
        span: 90..99,
        label: String::new(),
    };
    let told = render(
        &[Diagnostic::new("c", "m", vec![place], "h")],
        Some(&source),
        Look::Plain,
    );
    assert!(told.contains("s.toml:1:6"), "{told}");
}
