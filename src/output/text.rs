//! Plain text for people: 78 columns, no boxes, no meaning carried by colour.

use anstyle::Style;

/// Widest line.
const WIDTH: usize = 78;
/// Indent of everything below a heading.
const INDENT: &str = "  ";
/// Longest name shown in a table.
const LONGEST_NAME: usize = 30;

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
        self.text.push_str(&format!("{bold}{}{bold:#}\n", plain(words)));
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

    /// A table; columns are as wide as their widest cell.
    pub fn table(&mut self, header: &[(&str, Align)], lines: &[Line]) {
        let mut widths: Vec<usize> = header.iter().map(|(name, _)| width(name)).collect();
        for line in lines {
            if let Line::Cells(cells) = line {
                for (widest, cell) in widths.iter_mut().zip(cells) {
                    *widest = (*widest).max(width(cell));
                }
            }
        }
        let names: Vec<String> = header.iter().map(|(name, _)| (*name).to_owned()).collect();
        self.cells(&names, &widths, header);
        for line in lines {
            match line {
                Line::Cells(cells) => self.cells(cells, &widths, header),
                Line::Words(words) => self.wrapped("      ", words),
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
            line.push_str("   ");
        }
        self.text.push_str(line.trim_end());
        self.text.push('\n');
    }

    fn wrapped(&mut self, indent: &str, words: &str) {
        let mut line = String::from(indent);
        let mut is_empty = true;
        // A percent sign stays on the line of its number.
        let words = plain(words).replace(" %", "\u{1}%");
        for word in words.split_whitespace() {
            let word = word.replace('\u{1}', " ");
            let word = word.as_str();
            if !is_empty && width(&line) + 1 + width(word) > WIDTH {
                self.text.push_str(&line);
                self.text.push('\n');
                line = String::from(indent);
                is_empty = true;
            }
            if !is_empty {
                line.push(' ');
            }
            line.push_str(word);
            is_empty = false;
        }
        self.text.push_str(&line);
        self.text.push('\n');
    }

    /// The whole text.
    pub fn finish(self) -> String {
        self.text
    }
}

/// Text without control characters: a unit's name must not move a terminal's cursor.
pub fn plain(text: &str) -> String {
    text.chars().map(|c| if c.is_control() { ' ' } else { c }).collect()
}

/// A name for a table: without control characters, and cut where it is very long.
pub fn name(text: &str) -> String {
    let text = plain(text);
    if width(&text) <= LONGEST_NAME {
        return text;
    }
    let cut: String = text.chars().take(LONGEST_NAME - 1).collect();
    format!("{cut}…")
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
    fn a_path_with_spaces_is_one_word_to_a_shell() {
        assert_eq!(shell_word("pools.run".as_ref()), "pools.run");
        assert_eq!(shell_word("our pools.run".as_ref()), "'our pools.run'");
        assert_eq!(shell_word("-x".as_ref()), "'-x'");
        assert_eq!(shell_word("it's".as_ref()), "'it'\\''s'");
    }
}
