//! Everything that is tested from outside, one file a topic.

mod ledger;
