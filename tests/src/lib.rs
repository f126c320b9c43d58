//! Shared fixtures of the integration tests.
