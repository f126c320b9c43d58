//! hillpull-physics
