//! The table, and what it says about success.

use super::*;

fn row(intent: Intent, outcome: Outcome, why: &str) -> Row {
    Row { intent, outcome, sent: "A?".to_owned(), received: "1".to_owned(), why: why.to_owned() }
}

#[test]
fn the_table_shows_every_row_with_its_reason_below() {
    let mut findings = Findings::new("mine", "TCPIP::fan::5025::SOCKET", Some("Fan,1"));
    assert!(!findings.good(), "nothing was tried");
    findings.add(row(Intent::Identify, Outcome::Works, ""));
    assert!(findings.good());
    findings.add(Row { sent: String::new(), ..row(Intent::Reset, Outcome::Skipped, "never tried") });
    assert!(findings.good());
    findings.add(row(Intent::VerticalGet, Outcome::Refused, "error -113"));
    assert!(!findings.good());
    let lines: Vec<String> = findings.to_string().lines().map(str::to_owned).collect();
    assert_eq!(lines[0], "the dialect mine at TCPIP::fan::5025::SOCKET, which is Fan,1");
    assert_eq!(lines[1], "identify          works    A?  → 1");
    assert_eq!(lines[2], "reset             skipped  never tried");
    assert_eq!(lines[4].trim(), "error -113");
    assert_eq!(lines.last().map(String::as_str), Some("1 works, 0 differs, 1 refused, 1 skipped"));
}

#[test]
fn long_and_unprintable_texts_become_short_lines() {
    let text = short(&"ä\n".repeat(100));
    assert_eq!((text.chars().count(), text.contains('\n')), (57, false));
    assert_eq!(short("as it is"), "as it is");
}
