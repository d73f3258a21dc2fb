//! Rounding of the scope's settings.

#![allow(clippy::float_cmp)]

use super::*;

#[test]
fn spans_go_up_in_steps_of_one_two_five() {
    for (asked, set) in
        [(0.01, 0.01), (0.011, 0.02), (0.3, 0.5), (0.5, 0.5), (5.0000000001, 5.0), (5.1, 10.0), (99.0, 100.0)]
    {
        assert_eq!(span_step(asked), set, "{asked}");
    }
}

#[test]
fn intervals_go_to_the_nearest_step() {
    for (asked, set) in
        [(1e-10, 1e-10), (4e-10, 4e-10), (5e-10, 4e-10), (7e-10, 1e-9), (2.9e-9, 4e-9), (1e-2, 1e-2), (9e-3, 1e-2)]
    {
        assert_eq!(interval_step(asked), set, "{asked}");
    }
}

#[test]
fn delays_go_to_the_nearest_fifty_picoseconds() {
    for (asked, set) in [(2.3e-9, 2.3e-9), (2.32e-9, 2.3e-9), (-2.33e-9, -2.35e-9), (1e-7, 1e-7), (2e-11, 0.0)] {
        assert_eq!(delay_step(asked), set, "{asked}");
    }
}
