//! The story: open, read once, add up, estimate, report. Threads start only here.

mod measure;
mod order;
mod pipeline;

pub use measure::measure;
