//! Everything that is tested from outside, one file a topic.

mod ledger;
//! The one integration binary, one file a topic.

mod supervisor;
