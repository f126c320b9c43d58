//! Shared fixtures of the integration tests.

pub mod published;

pub mod program;

pub mod relief_fixtures;
