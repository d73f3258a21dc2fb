//! In which order whatever wishes the daemon to end.

use std::time::Duration;

use tokio::sync::mpsc::Sender;
use tokio::time::timeout;

use super::*;

/// In paused time: long enough for whatever is there to be seen, and over at once if nothing is.
const WHILE: Duration = Duration::from_secs(1);

fn endings() -> (Sender<Wish>, Endings) {
    let (sender, wishes) = mpsc::channel(WAITING);
    (sender, Endings { wishes, signals: 0 })
}

/// Catches: a daemon that leaves a bench as it is because whoever started it closes its input and sends SIGTERM.
#[tokio::test(start_paused = true)]
async fn the_end_of_standard_input_and_a_signal_are_one_wish() {
    for wishes in [[Wish::StdinClosed, Wish::Signal("SIGTERM")], [Wish::Signal("SIGTERM"), Wish::StdinClosed]] {
        let (sender, mut endings) = endings();
        wishes.iter().for_each(|wish| sender.try_send(*wish).unwrap());
        let why = if wishes[0] == Wish::StdinClosed { "standard input was closed" } else { "SIGTERM" };
        assert_eq!(timeout(WHILE, endings.first()).await, Ok(why));
        assert!(timeout(WHILE, endings.at_once()).await.is_err(), "{wishes:?} end at once");
        sender.try_send(Wish::Signal("SIGINT")).unwrap();
        assert_eq!(timeout(WHILE, endings.at_once()).await, Ok("SIGINT"));
    }
}

/// Catches: an impatient person who is not heard.
#[tokio::test(start_paused = true)]
async fn a_second_signal_ends_at_once() {
    let (sender, mut endings) = endings();
    (0..2).for_each(|_| sender.try_send(Wish::Signal("SIGINT")).unwrap());
    assert_eq!(timeout(WHILE, endings.first()).await, Ok("SIGINT"));
    assert_eq!(timeout(WHILE, endings.at_once()).await, Ok("SIGINT"));
}
