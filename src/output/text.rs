//! Plain text for people: 78 columns, no boxes, no meaning carried by colour.

use crate::output::manifest::sha256;
use anstyle::Style;

/// Widest line.
const WIDTH: usize = 78;
/// Indent of everything below a heading.
const INDENT: &str = "  ";
/// Longest name that stands on the line of its figures.
const LONGEST_BESIDE: usize = 44;
/// Longest word that is shown whole.
const LONGEST_WORD: usize = 160;
/// Space between two columns of a table.
const GAP: &str = "   ";

/// Text in the making.
#[derive(Debug, Default)]
pub struct Page {
    text: String,
}

/// Where the cells of a column stand.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Align {
    /// At the left: words.
    Left,
    /// At the right: figures.
    Right,
}

/// One line of a table.
#[derive(Debug)]
pub enum Line {
    /// A cell for each column.
    Cells(Vec<String>),
    /// Words that run under the line above.
    Words(String),
}

impl Page {
    /// A heading; bold where the stream can show it.
    pub fn heading(&mut self, words: &str) {
        if !self.text.is_empty() {
            self.text.push('\n');
        }
        let bold = Style::new().bold();
        for line in lines_of("", words) {
            self.text.push_str(&format!("{bold}{line}{bold:#}\n"));
        }
    }

    /// A paragraph below a heading.
    pub fn paragraph(&mut self, words: &str) {
        self.wrapped(INDENT, words);
    }

    /// Words at the left edge.
    pub fn aside(&mut self, words: &str) {
        self.wrapped("", words);
    }

    /// One item of a list.
    pub fn item(&mut self, words: &str) {
        let start = self.text.len();
        self.wrapped("    ", words);
        // The dash takes the place of the first line's indent.
        self.text.replace_range(start..start + 4, "  - ");
    }

    /// A line that must stay whole: a command.
    pub fn verbatim(&mut self, line: &str) {
        self.text.push_str(&format!("{INDENT}{INDENT}{}\n", plain(line)));
    }

    /// A table, its first column names: columns are as wide as their widest cell.
    ///
    /// A name that leaves no room for the figures stands on lines of its own, its figures below it;
    /// where the figures alone fill the page, each stands on a line with the name of its column.
    pub fn table(&mut self, header: &[(&str, Align)], lines: &[Line]) {
        let shown: Vec<Vec<String>> = lines
            .iter()
            .filter_map(|line| match line {
                Line::Cells(cells) => Some(cells.iter().map(|cell| shortened(&plain(cell))).collect()),
                Line::Words(_) => None,
            })
            .collect();
        let mut widths: Vec<usize> = header.iter().map(|(name, _)| width(name)).collect();
        for (column, widest) in widths.iter_mut().enumerate().skip(1) {
            let cells = shown.iter().filter_map(|cells| cells.get(column));
            *widest = cells.map(|cell| width(cell)).fold(*widest, usize::max);
        }
        let of_figures: usize = widths.iter().skip(1).map(|widest| GAP.len() + widest).sum();
        let room = (WIDTH - INDENT.len()).saturating_sub(of_figures).min(LONGEST_BESIDE);
        let first = widths.first().copied().unwrap_or(0);
        let is_stacked = room < first;
        let names = shown.iter().filter_map(|cells| cells.first()).map(|name| width(name));
        let beside = names.filter(|&name| name <= room).fold(first, usize::max);
        if let Some(first) = widths.first_mut() {
            *first = beside;
        }
        if !is_stacked {
            let names: Vec<String> = header.iter().map(|(name, _)| (*name).to_owned()).collect();
            self.cells(&names, &widths, header);
        }
        let mut shown = shown.into_iter();
        for line in lines {
            match line {
                Line::Words(words) => self.wrapped("      ", words),
                Line::Cells(_) => {
                    let Some(mut cells) = shown.next() else { continue };
                    let name = cells.first().cloned().unwrap_or_default();
                    if is_stacked {
                        self.wrapped(INDENT, &name);
                        for ((label, _), cell) in header.iter().zip(&cells).skip(1) {
                            self.wrapped("      ", format!("{label}: {cell}").trim_start_matches(": "));
                        }
                        continue;
                    }
                    if width(&name) > room {
                        self.wrapped(INDENT, &name);
                        cells[0].clear();
                    }
                    self.cells(&cells, &widths, header);
                }
            }
        }
    }

    fn cells(&mut self, cells: &[String], widths: &[usize], header: &[(&str, Align)]) {
        let mut line = String::from(INDENT);
        for ((cell, &widest), (_, align)) in cells.iter().zip(widths).zip(header) {
            let fill = " ".repeat(widest.saturating_sub(width(cell)));
            match align {
                Align::Left => line.push_str(&format!("{cell}{fill}")),
                Align::Right => line.push_str(&format!("{fill}{cell}")),
            }
            line.push_str(GAP);
        }
        self.text.push_str(line.trim_end());
        self.text.push('\n');
    }

    fn wrapped(&mut self, indent: &str, words: &str) {
        for line in lines_of(indent, words) {
            self.text.push_str(&line);
            self.text.push('\n');
        }
    }

    /// The whole text.
    pub fn finish(self) -> String {
        self.text
    }
}

/// Words in lines of at most [`WIDTH`] columns.
fn lines_of(indent: &str, words: &str) -> Vec<String> {
    let mut lines = Vec::new();
    let mut line = String::from(indent);
    let mut is_empty = true;
    // A percent sign stays on the line of its number, and a power of ten on that of its digits.
    let words = plain(words).replace(" %", "\u{1}%").replace(" × ", "\u{1}×\u{1}");
    for word in words.split_whitespace() {
        let word = shortened(&word.replace('\u{1}', " "));
        let mut letters: Vec<char> = word.chars().collect();
        loop {
            if !is_empty && width(&line) + 1 + letters.len() > WIDTH {
                lines.push(std::mem::replace(&mut line, String::from(indent)));
                is_empty = true;
            }
            if !is_empty {
                line.push(' ');
            }
            // A name without spaces may be longer than a line.
            let room = WIDTH - width(&line);
            let rest = letters.split_off(letters.len().min(room));
            line.extend(letters);
            is_empty = false;
            if rest.is_empty() {
                break;
            }
            letters = rest;
        }
    }
    lines.push(line);
    lines
}

/// Text in which nothing can steer a terminal: line breaks and tabs become spaces, all other control
/// and format characters are written out (`\u{202e}`).
pub fn plain(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '\n' | '\r' | '\t' => out.push(' '),
            c if is_unseen(c) => out.extend(c.escape_unicode()),
            c => out.push(c),
        }
    }
    out
}

/// Whether a character is not seen itself but changes how others are shown: a control character, or
/// one of Unicode's format characters (category Cf, version 16; the list is from memory) and separators
/// of lines. A name with one in it can pass for another name, or turn the text around it.
///
/// Left out are the two joiners (U+200C, U+200D), without which Persian and Hindi names are misspelt.
pub fn is_unseen(c: char) -> bool {
    c.is_control()
        || matches!(
            c,
            '\u{ad}'
                | '\u{600}'..='\u{605}'
                | '\u{61c}'
                | '\u{6dd}'
                | '\u{70f}'
                | '\u{890}'..='\u{891}'
                | '\u{8e2}'
                | '\u{180e}'
                | '\u{200b}'
                | '\u{200e}'..='\u{200f}'
                | '\u{2028}'..='\u{202e}'
                | '\u{2060}'..='\u{206f}'
                | '\u{feff}'
                | '\u{fff9}'..='\u{fffb}'
                | '\u{110bd}'
                | '\u{110cd}'
                | '\u{13430}'..='\u{1343f}'
                | '\u{1bca0}'..='\u{1bca3}'
                | '\u{1d173}'..='\u{1d17a}'
                | '\u{e0001}'
                | '\u{e0020}'..='\u{e007f}'
        )
}

/// A very long name with its middle left out. Some digits of its hash stand there: two names that
/// differ in the middle alone are still told apart.
fn shortened(text: &str) -> String {
    const ENDS: usize = 60;
    let length = width(text);
    if length <= LONGEST_WORD {
        return text.to_owned();
    }
    let start: String = text.chars().take(ENDS).collect();
    let end: String = text.chars().skip(length - ENDS).collect();
    let hash = sha256(text.as_bytes());
    format!("{start}…[{length} characters, {}]…{end}", &hash[..8])
}

/// A path as an argument that a shell takes as one word.
pub fn shell_word(path: &std::path::Path) -> String {
    let text = path.display().to_string();
    let is_safe = |c: char| c.is_alphanumeric() || matches!(c, '/' | '.' | '_' | '-' | '+' | ',' | ':' | '@');
    if !text.is_empty() && !text.starts_with('-') && text.chars().all(is_safe) {
        text
    } else {
        format!("'{}'", text.replace('\'', "'\\''"))
    }
}

fn width(text: &str) -> usize {
    text.chars().count()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn no_line_is_wider_than_the_page() {
        let mut page = Page::default();
        page.paragraph(&"word ".repeat(60));
        page.item(&"other ".repeat(40));
        assert!(page.finish().lines().all(|line| line.chars().count() <= WIDTH));
    }

    #[test]
    fn a_percent_sign_stays_with_its_number() {
        for filler in 60..80 {
            let mut page = Page::default();
            page.paragraph(&format!("{} 95 % interval", "x".repeat(filler)));
            let text = page.finish();
            assert!(text.contains("95 %"), "{text}");
        }
    }

    #[test]
    fn control_characters_do_not_reach_a_terminal() {
        let mut page = Page::default();
        page.heading("a\u{1b}[2Jb");
        page.paragraph("c\u{1b}]0;x\u{7}d");
        page.verbatim("e\rf");
        let text = page.finish().replace("\u{1b}[1m", "").replace("\u{1b}[0m", "");
        assert!(!text.chars().any(|c| c.is_control() && c != '\n'), "{text:?}");
    }

    #[test]
    fn what_turns_text_around_is_written_out() {
        for c in "\u{202a}\u{202e}\u{2066}\u{2069}\u{200e}\u{200f}\u{61c}\u{feff}\u{9b}\u{1b}".chars() {
            let told = plain(&format!("a{c}b"));
            assert_eq!(told, format!("a\\u{{{:x}}}b", u32::from(c)));
        }
        assert_eq!(plain("می\u{200c}شود é\tx"), "می\u{200c}شود é x");
    }

    fn table(names: &[&str], figure: &str) -> String {
        let mut page = Page::default();
        let lines: Vec<Line> = names
            .iter()
            .map(|name| Line::Cells(vec![(*name).to_owned(), figure.to_owned(), figure.to_owned()]))
            .collect();
        let header = [("unit", Align::Left), ("from", Align::Right), ("to", Align::Right)];
        page.table(&header, &lines);
        page.finish()
    }

    #[test]
    fn a_long_name_stands_whole_above_its_figures() {
        let long = "season=winter with deck=grooved and sanded twice a week";
        let text = table(&["deck=grooved", long], "0.76 to 0.91");
        assert!(text.contains(&format!("\n  {long}\n")), "{text}");
        assert!(
            text.contains("  deck=grooved   0.76 to 0.91   0.76 to 0.91\n"),
            "{text}"
        );
        assert!(
            text.ends_with("\n                 0.76 to 0.91   0.76 to 0.91\n"),
            "{text}"
        );
    }

    #[test]
    fn names_of_thousands_of_characters_still_differ_and_fit() {
        let name = |middle: &str| format!("{}{middle}{}", "a".repeat(3000), "z".repeat(3000));
        let (first, second) = (table(&[&name("1")], "1"), table(&[&name("2")], "1"));
        assert_ne!(first, second);
        assert!(
            first.contains('…') && first.lines().all(|line| width(line) <= WIDTH),
            "{first}"
        );
        assert!(first.lines().count() < 8, "{first}");
    }

    #[test]
    fn figures_that_fill_the_page_stand_below_each_other() {
        let text = table(&["Weir"], &"9".repeat(40));
        assert!(text.lines().all(|line| width(line) <= WIDTH), "{text}");
        assert!(text.contains("  Weir\n      from: 999"), "{text}");
    }

    #[test]
    fn headings_and_long_words_stay_within_the_page() {
        let mut page = Page::default();
        page.heading(&"title ".repeat(30));
        page.paragraph(&format!("a {}", "b".repeat(150)));
        let text = page.finish().replace("\u{1b}[1m", "").replace("\u{1b}[0m", "");
        assert!(text.lines().all(|line| width(line) <= WIDTH), "{text}");
        assert_eq!(text.matches('b').count(), 150);
    }

    #[test]
    fn a_path_with_spaces_is_one_word_to_a_shell() {
        assert_eq!(shell_word("pools.run".as_ref()), "pools.run");
        assert_eq!(shell_word("our pools.run".as_ref()), "'our pools.run'");
        assert_eq!(shell_word("-x".as_ref()), "'-x'");
        assert_eq!(shell_word("it's".as_ref()), "'it'\\''s'");
    }
}
