//! The one integration binary: one module a topic.

mod host;
