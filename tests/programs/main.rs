//! Whole-program tests.

mod analyse;
