//! Properties of the text reader: it never panics, and numbers survive every way of writing them.

use proptest::prelude::*;

use super::*;

/// A row's numbers as written in a style.
fn written(values: &[f64], separator: char, decimal: char, exponent: bool) -> String {
    let number = |value: &f64| {
        let text = if exponent { format!("{value:e}") } else { format!("{value}") };
        text.replace('.', &decimal.to_string())
    };
    values.iter().map(number).collect::<Vec<_>>().join(&separator.to_string())
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(256))]

    #[test]
    fn any_text_is_read_or_refused(text in "(?s).{0,400}") {
        let _ = from_text(&text, None, &Options::default());
        let _ = from_text(&text, Some(&text), &Options::default());
    }

    #[test]
    fn any_text_made_of_the_marks_is_read_or_refused(text in "[-+0-9eE.,;\\t \\n\\r\"#tpnVsm()_]{0,400}") {
        let _ = read_text(&text, &Options::default());
        let told = Options { header_lines: Some(3), interval_s: Some(1e-9), ..Options::default() };
        let _ = from_text(&text, None, &told);
    }

    #[test]
    fn numbers_survive_every_style(
        values in prop::collection::vec((-1e9..1e9f64, -1e3..1e3f64, -1e-6..1e-6f64), 4..40),
        style in 0_usize..7,
        exponent in any::<bool>(),
        header in any::<bool>(),
        end in prop::sample::select(vec!["\n", "\r\n", "\r"]),
    ) {
        // A whole number in every field would leave comma and blank undecided.
        let (separator, decimal) =
            [(',', '.'), (';', '.'), (';', ','), ('\t', '.'), ('\t', ','), (' ', '.'), (' ', ',')][style];
        let mut text = String::new();
        if header {
            text.push_str(&["a", "b", "c"].join(&separator.to_string()));
            text.push_str(end);
        }
        for (a, b, c) in &values {
            text.push_str(&written(&[*a, *b, *c], separator, decimal, exponent));
            text.push_str(end);
        }
        let table = read_text(&text, &Options::default()).unwrap();
        prop_assert_eq!(table.columns.len(), 3);
        for (i, (a, b, c)) in values.iter().enumerate() {
            // To the last bit: the digits are those of the shortest text that brings the double back.
            prop_assert_eq!(table.columns[0].values[i].to_bits(), a.to_bits());
            prop_assert_eq!(table.columns[1].values[i].to_bits(), b.to_bits());
            prop_assert_eq!(table.columns[2].values[i].to_bits(), c.to_bits());
        }
    }
}
