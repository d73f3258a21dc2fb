//! Whole-program tests: the real binaries on a simulated bench, driven as a user would drive them.

#![allow(clippy::unwrap_used, reason = "a test that cannot go on has failed")]

mod analyse;
mod bench;
mod commands;
mod crash;
mod demo;
mod deskew;
mod files;
mod refusals;
mod rest;
mod scripts;
mod sequences;
