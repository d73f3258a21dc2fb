//! Rules of the house that a machine can check: floors, file sizes, module docs, documented keys, names that lead
//! somewhere. `DEVELOPERS.md` says why each stands.

mod files;
mod floors;
mod names;
