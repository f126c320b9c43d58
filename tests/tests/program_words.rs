//! What the program says about itself.

use hillpull_tests::program::{Folder, binary};
use insta::assert_snapshot;
use std::process::{Command, Stdio};

fn says(words: &str) -> String {
    let ran = Folder::new().run(words);
    assert_eq!((ran.code, ran.stderr.as_str()), (Some(0), ""));
    ran.stdout
}

#[test]
fn version() {
    assert_eq!(
        says("--version"),
        format!("hillpull {}\n", env!("CARGO_PKG_VERSION"))
    );
}

#[test]
fn help() {
    assert_snapshot!(says("--help"), @"");
}

#[test]
fn help_of_effect() {
    assert_snapshot!(says("effect --help"), @"");
}

#[test]
fn no_command_shows_the_help() {
    let ran = Folder::new().run("");
    assert_eq!((ran.code, ran.stdout.as_str()), (Some(2), ""));
    assert_eq!(ran.stderr, says("-h"));
}

#[test]
fn unknown_command() {
    let ran = Folder::new().run("efect");
    assert_eq!((ran.code, ran.stdout.as_str()), (Some(2), ""));
    assert_snapshot!(ran.stderr, @"");
}

#[test]
fn completions_for_every_shell_know_the_options() {
    for shell in ["bash", "elvish", "fish", "powershell", "zsh"] {
        let script = says(&format!("completions {shell}"));
        for word in ["effect", "below-zero", "tolerance"] {
            assert!(script.contains(word), "{shell} misses {word}");
        }
    }
    assert_eq!(Folder::new().run("completions abacus").code, Some(2));
}

#[test]
fn bash_accepts_its_completions() {
    let folder = Folder::new();
    folder.write("script", &says("completions bash"));
    match Command::new("bash")
        .arg("-n")
        .arg(folder.path("script"))
        .status()
    {
        Ok(status) => assert!(status.success()),
        Err(_) => eprintln!("SKIPPED bash_accepts_its_completions: no bash here"),
    }
}

#[test]
fn manual_pages() {
    let program = says("manual");
    assert!(program.contains(".TH hillpull 1"), "{program}");
    assert!(program.contains("Exit codes"));
    let effect = says("manual effect");
    assert!(
        effect.contains(".TH hillpull\\-effect 1") || effect.contains(".TH hillpull-effect 1"),
        "{effect}"
    );
    assert!(effect.contains("tolerance"));
    let ran = Folder::new().run("manual nothing");
    assert_eq!(ran.code, Some(2));
    assert_snapshot!(ran.stderr, @"");
}

#[test]
fn help_into_a_closed_pipe_is_no_error() {
    let mut child = Command::new(binary())
        .args(["effect", "--help"])
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let out = child.wait_with_output().unwrap();
    assert_eq!(
        (
            out.status.code(),
            String::from_utf8(out.stderr).unwrap().as_str()
        ),
        (Some(0), "")
    );
}
