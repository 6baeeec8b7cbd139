//! What people and programs are shown. Consumes events and sums of events, so a ledger that is read again goes
//! through the same reports as a window that has just ended.

pub mod coverage;
pub mod drill;
pub mod evidence;
pub mod figures;
pub mod gathering;
pub mod ledger;
pub mod plan;
pub mod reckon;
pub mod text;
pub mod window;
