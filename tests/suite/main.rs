//! The one integration binary, one file a topic.

mod supervisor;
