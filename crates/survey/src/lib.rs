//! hillpull-survey
