//! Long lines, broken between words so that they fit a terminal.

use super::WIDTH;

/// `line` in lines of at most [`WIDTH`] characters; those after the first are set in by `indent`. A word that is longer,
/// a path say, stays whole.
pub(crate) fn wrap(line: &str, indent: usize) -> String {
    let mut wrapped = String::with_capacity(line.len());
    let mut column = 0;
    for word in line.split_inclusive(' ') {
        let width = word.trim_end().chars().count();
        if column > indent && column + width > WIDTH {
            wrapped.truncate(wrapped.trim_end().len());
            wrapped.push('\n');
            wrapped.push_str(&" ".repeat(indent));
            column = indent;
        }
        wrapped.push_str(word);
        column += word.chars().count();
    }
    wrapped
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_fits_stays_as_it_is() {
        assert_eq!(wrap("  a short line", 4), "  a short line");
        let full = "x".repeat(39) + " " + &"y".repeat(40);
        assert_eq!(wrap(&full, 4), full);
    }

    #[test]
    fn a_long_line_is_broken_between_words() {
        let long = format!("  {}", ["word"; 40].join(" "));
        let wrapped = wrap(&long, 6);
        assert!(wrapped.lines().all(|line| line.chars().count() <= WIDTH && line == line.trim_end()), "{wrapped}");
        assert!(wrapped.lines().skip(1).all(|line| line.starts_with("      word")), "{wrapped}");
        assert_eq!(wrapped.split_whitespace().count(), 40);
    }

    #[test]
    fn a_word_that_is_too_long_stays_whole() {
        let path = format!("/{}", "p".repeat(100));
        assert_eq!(wrap(&format!("see {path} there"), 2), format!("see\n  {path}\n  there"));
    }
}
