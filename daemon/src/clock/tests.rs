//! The clocks: what moves which hand.

#![allow(clippy::unwrap_used)]

use jiff::SignedDuration;

use super::hand::HandClock;
use super::*;

fn evening() -> Timestamp {
    "2026-03-01T22:00:00Z".parse().unwrap()
}

#[test]
fn advancing_moves_both_clocks_and_every_clone() {
    let clock = HandClock::new(evening());
    let other = clock.clone();
    clock.advance(Duration::from_secs(3600));
    assert_eq!(other.now(), "2026-03-01T23:00:00Z".parse().unwrap());
    assert_eq!(other.elapsed(), Duration::from_secs(3600));
}

#[test]
fn a_jump_of_the_wall_clock_lets_no_time_pass() {
    let clock = HandClock::new(evening());
    clock.advance(Duration::from_secs(5));
    clock.jump(SignedDuration::from_hours(-1));
    assert_eq!(clock.now(), "2026-03-01T21:00:05Z".parse().unwrap());
    assert_eq!(clock.elapsed(), Duration::from_secs(5));
    clock.set_wall(evening());
    assert_eq!(clock.now(), evening());
    assert_eq!(clock.elapsed(), Duration::from_secs(5));
}

#[test]
fn the_ends_of_the_calendar_hold() {
    let clock = HandClock::new(Timestamp::MAX);
    clock.advance(Duration::MAX);
    assert_eq!(clock.now(), Timestamp::MAX);
    assert_eq!(clock.elapsed(), Duration::MAX);
    let clock = HandClock::new(Timestamp::MIN);
    clock.jump(SignedDuration::MIN);
    assert_eq!(clock.now(), Timestamp::MIN);
}

#[test]
fn the_real_clock_does_not_go_backwards() {
    let clock = RealClock::new();
    let (first, second) = (clock.elapsed(), clock.elapsed());
    assert!(second >= first, "{second:?} after {first:?}");
    let before = Timestamp::now();
    assert!(clock.now() >= before);
}
