//! Small changes to the shipped TOML files, made on the text so that everything else stays as it is.

/// `text` with `key = value` inside the table `[table]`; `value` is TOML text. The key must be there already, so that a
/// test cannot silently change nothing.
///
/// # Panics
/// When the table or the key is not there: the test would not test what it says.
#[must_use]
pub fn set_in_table(text: &str, table: &str, key: &str, value: &str) -> String {
    let head = format!("[{table}]");
    let mut inside = table.is_empty();
    let mut done = false;
    let lines: Vec<String> = text
        .lines()
        .map(|line| {
            if line.starts_with('[') {
                inside = line.trim_end() == head;
            }
            let is_key = line.split('=').next().is_some_and(|name| name.trim() == key) && line.contains('=');
            if inside && is_key && !done {
                done = true;
                return format!("{key} = {value}");
            }
            line.to_owned()
        })
        .collect();
    assert!(done, "there is no `{key}` in [{table}]");
    lines.join("\n") + "\n"
}

/// `text` with `key = value` inside the table that the `nth` line `head` (such as `[[leg]]`, from 0) begins.
///
/// # Panics
/// When there is no such line, or its table has no such key.
#[must_use]
pub fn set_in_nth(text: &str, head: &str, nth: usize, key: &str, value: &str) -> String {
    let mut heads = 0;
    let mut done = false;
    let mut inside = false;
    let lines: Vec<String> = text
        .lines()
        .map(|line| {
            if line.starts_with('[') {
                inside = line.trim_end() == head && heads == nth;
                heads += usize::from(line.trim_end() == head);
            }
            let is_key = line.split_once('=').is_some_and(|(name, _)| name.trim() == key);
            if inside && is_key && !done {
                done = true;
                return format!("{key} = {value}");
            }
            line.to_owned()
        })
        .collect();
    assert!(done, "there is no `{key}` in {head} number {nth}");
    lines.join("\n") + "\n"
}

/// A bench file's text with the address of one instrument.
#[must_use]
pub fn set_resource(text: &str, instrument: &str, resource: &str) -> String {
    set_in_table(text, &format!("instrument.{instrument}"), "resource", &format!("\"{resource}\""))
}
