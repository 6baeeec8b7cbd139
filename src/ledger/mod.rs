//! The ledger: what happened to each core, kept so that it can be relied on years later.
//!
//! | file | what it knows |
//! |---|---|
//! | `names` | file names, limits, versions |
//! | `digest` | SHA-256 as it is written |
//! | `record` | **the byte layout of a line**; encoder and decoder |
//! | `folder` | **the layout of the folder**: marker, lock, segments |
//! | `scan` | one segment: good lines, and whether what follows is torn or damaged |
//! | `recover` | **how a ledger is read**: the chain across segments, torn tails, the verdict |
//! | `condition` | `clean`, `torn tail`, `broken at seq N, because` |
//! | `journal`, `disk` | writing: chained, synced, dead after the first failure |
//! | `intents` | what was under way when a job was cut off |
//! | `cells`, `episodes`, `scatter` | counts and times for the statistics; no statistics |
//! | `view`, `filter` | one pass over a ledger for everything that is to be shown of it |
//! | `groups`, `wrongs`, `history`, `words`, `places` | what `view` gathers: sums by core, kernel …; wrong slices; timeline; wrong words |
//! | `salvage` | a new ledger from what can be read of a damaged one |
//! | `error` | what can go wrong, with place and remedy |
//!
//! The chain shows damage, lost lines and careless edits. It is no signature: who can write the folder can write
//! another ledger.

pub mod cells;
pub mod condition;
pub mod digest;
mod disk;
pub mod episodes;
pub mod error;
pub mod filter;
mod folder;
pub mod groups;
pub mod history;
pub mod intents;
pub mod journal;
pub mod names;
pub mod places;
pub mod record;
pub mod recover;
pub mod salvage;
mod scan;
mod scatter;
pub mod view;
pub mod words;
pub mod wrongs;

pub use cells::{Cell, CellKey, Scope, Tally};
pub use condition::{Because, Condition, Torn};
pub use digest::Digest;
pub use episodes::Episode;
pub use error::Error;
pub use folder::Marker;
pub use intents::OpenIntents;
pub use journal::{Journal, Opening, must_sync};
pub use record::Record;
pub use recover::{Entry, Head, Reader, Summary, verify};
pub use salvage::{Salvage, salvage};
pub use view::View;
