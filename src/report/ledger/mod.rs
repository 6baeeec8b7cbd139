//! What a ledger says: `ledger show` and `ledger verify`, as documents and as text.
//!
//! | file | what it shows |
//! |---|---|
//! | `shown` | the document of `ledger show`, and what it says without options |
//! | `columns` | figures as columns of a table |
//! | `sums` | tables by cpu, core, kernel, family, condition, day, cell |
//! | `episodes`, `timeline` | when it was wrong; a cpu's history |
//! | `words`, `words_text` | bits, lanes and operands of wrong words |
//! | `sentences`, `analysis` | what they suggest and what they cannot; the tests behind that |
//! | `layout` | what the words of a kernel's output hold |
//! | `utc` | the host's clock for people |
//! | `verified` | `ledger verify` |

mod analysis;
mod columns;
mod episodes;
pub mod layout;
mod sentences;
mod shown;
mod sums;
mod timeline;
pub mod utc;
mod verified;
mod words;
mod words_text;

pub use shown::{Ask, Shown};
pub use verified::Verified;
