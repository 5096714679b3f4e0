//! Names made safe to print, and paragraphs.

use unicode_width::UnicodeWidthStr;

/// A name from a file as it may stand on a terminal: control and direction characters are shown as escapes.
///
/// ```
/// assert_eq!(tallystone::report::shown("ok\u{1b}[31m"), "ok\\u{1b}[31m");
/// ```
pub fn shown(name: &str) -> String {
    let hidden = |c: char| {
        c.is_control()
            || matches!(c, '\u{ad}' | '\u{61c}' | '\u{180e}' | '\u{200b}'..='\u{200f}' | '\u{2028}'..='\u{202e}')
            || matches!(c, '\u{2060}'..='\u{206f}' | '\u{feff}' | '\u{fff9}'..='\u{fffb}' | '\u{e0000}'..='\u{e007f}')
    };
    let mut text = String::with_capacity(name.len());
    for c in name.chars() {
        if hidden(c) { text.extend(c.escape_unicode()) } else { text.push(c) }
    }
    text
}

/// A paragraph in lines of at most `width` columns; later lines start with `indent` spaces. Words are never parted,
/// and blanks within a line stay as they are: they may belong to a name.
pub fn wrapped(text: &str, width: usize, indent: usize) -> String {
    let mut lines = String::new();
    let mut used = 0;
    for word in text.split(' ') {
        let columns = word.width();
        if used > 0 && used + 1 + columns > width {
            lines.push('\n');
            lines.push_str(&" ".repeat(indent));
            used = indent;
        } else if used > 0 {
            lines.push(' ');
            used += 1;
        }
        lines.push_str(word);
        used += columns;
    }
    lines
}

/// A text cut to some columns, its middle replaced by an ellipsis.
pub(super) fn shortened(text: &str, columns: usize) -> String {
    if text.width() <= columns {
        return text.to_owned();
    }
    let keep = columns.saturating_sub(1);
    let (front, back) = (keep.div_ceil(2), keep / 2);
    let take = |from: &mut dyn Iterator<Item = char>, most: usize| {
        let mut part = Vec::new();
        let mut used = 0;
        for c in from {
            used += c.to_string().width();
            if used > most {
                break;
            }
            part.push(c);
        }
        part
    };
    let head: String = take(&mut text.chars(), front).into_iter().collect();
    let tail: String = take(&mut text.chars().rev(), back).into_iter().rev().collect();
    format!("{head}…{tail}")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_cannot_speak_to_the_terminal() {
        assert_eq!(shown("x\u{61c}y\u{e0041}"), "x\\u{61c}y\\u{e0041}");
        assert_eq!(shown("a\u{202e}b\tc\u{7}"), "a\\u{202e}b\\u{9}c\\u{7}");
        assert_eq!(shown("Prüfstand 3 ✓"), "Prüfstand 3 ✓");
    }

    #[test]
    fn paragraphs_keep_within_their_width() {
        let text = wrapped("one two three four five six seven", 12, 2);
        assert!(text.lines().all(|line| line.width() <= 12), "{text}");
        assert_eq!(text.split_whitespace().count(), 7);
        assert_eq!(wrapped("the file a  b.toml", 40, 0), "the file a  b.toml");
        assert_eq!(wrapped("unbreakable-and-long", 5, 0), "unbreakable-and-long");
    }

    #[test]
    fn long_names_keep_both_ends() {
        assert_eq!(shortened("absorption_probability:shipped", 15), "absorpt…shipped");
        assert_eq!(shortened("short", 15), "short");
        assert!(shortened("字字字字字字", 7).width() <= 7);
    }
}
