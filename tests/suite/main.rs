//! Everything that is tested from outside, one file a topic.

mod ledger;
//! The one integration binary, one file a topic.

mod supervisor;
//! One integration binary; one file a topic.

mod statistics;
mod statistics_edges;
//! The one integration binary: one module a topic.

mod host;
