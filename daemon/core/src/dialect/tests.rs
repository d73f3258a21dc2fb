//! The bundled dialect word by word, and what a dialect file may and may not say.

#![allow(clippy::unwrap_used, clippy::float_cmp)]

mod bundled;
mod convert;
mod files;
mod forms;
mod hostile;
mod like;
mod records;

use super::*;

/// The bundled dialect.
fn scpi_99() -> Dialect {
    Dialect::read(bundled("scpi-99").unwrap()).unwrap_or_else(|mistakes| panic!("{mistakes:#?}"))
}

/// A dialect out of a text that must be good.
fn dialect(text: &str) -> Dialect {
    Dialect::read(text).unwrap_or_else(|mistakes| panic!("{mistakes:#?}"))
}

/// The commands of a plan as one text, `~` before those that expect a line, `#` before those that expect a block.
fn said(dialect: &Dialect, call: &Call) -> String {
    let exchanges = dialect.plan(call).unwrap();
    exchanges.iter().fold(String::new(), |all, exchange| {
        let mark = match exchange.expect {
            Expect::Nothing => "",
            Expect::Line => "~",
            Expect::Block => "#",
        };
        all + mark + std::str::from_utf8(&exchange.send).unwrap()
    })
}

fn lines(replies: &[&str]) -> Vec<Message> {
    replies.iter().map(|line| Message::Line((*line).to_owned())).collect()
}
