//! The story.
