//! Where results go and what may stand in the way: an output either becomes whole or stays as it was.
#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use hillpull_tests::program::{Dem, Folder, HILL_RUN, Ran, refused};
use insta::assert_snapshot;
use std::fs::OpenOptions;
use std::process::{Child, Command, Stdio};
use std::time::{Duration, Instant};

const OLD: &str = "an earlier result\n";

#[test]
fn suffix_unknown() {
    let folder = Folder::with_survey();
    assert_snapshot!(refused(&folder, &HILL_RUN.replace("out.csv", "out.xls")), @"
    error: output out.xls: its suffix says no format that can be written

    hint: end the name with .csv or .gpkg, or use - for CSV on standard output
    ");
}

#[test]
fn folder_missing() {
    let folder = Folder::with_survey();
    assert_snapshot!(refused(&folder, &HILL_RUN.replace("out.csv", "results/out.csv")), @"
    error: output results/out.csv: the folder results does not exist

    hint: make the folder first
    ");
}

#[test]
fn output_is_a_folder() {
    let folder = Folder::with_survey();
    std::fs::create_dir(folder.path("results.csv")).unwrap();
    assert_snapshot!(refused(&folder, &HILL_RUN.replace("out.csv", "results.csv")), @"
    error: output results.csv: it exists and is not a file that could be replaced

    hint: name a file, or use - for CSV on standard output
    ");
}

#[test]
fn output_read_only() {
    let folder = Folder::with_survey();
    folder.write("kept.csv", OLD);
    let mut permissions = std::fs::metadata(folder.path("kept.csv"))
        .unwrap()
        .permissions();
    permissions.set_readonly(true);
    std::fs::set_permissions(folder.path("kept.csv"), permissions).unwrap();
    assert_snapshot!(refused(&folder, &HILL_RUN.replace("out.csv", "kept.csv")), @"
    error: output kept.csv: it exists and is read-only

    hint: make it writable or choose another name
    ");
    assert_eq!(folder.read("kept.csv"), OLD);
}

#[test]
fn output_is_an_input() {
    let folder = Folder::with_survey();
    assert_snapshot!(refused(&folder, &HILL_RUN.replace("out.csv", "stations.csv")), @"
    error: output stations.csv: it is also an input of this run

    hint: choose another name for the output
    ");
}

#[test]
fn result_column_already_there() {
    let folder = Folder::with_survey();
    folder.write(
        "stations.csv",
        "station,easting,northing,height,terrain_effect_mgal\nA,600025,5200025,1300,-1.5\n",
    );
    assert_snapshot!(refused(&folder, HILL_RUN), @r#"
    error: output out.csv: the station table already has a column "terrain_effect_mgal", which is the name of a result

    hint: rename or remove that column in the station table (is it the output of an earlier run?)
    "#);
}

/// A run with an earlier `out.csv` in the folder failed: code 3, the earlier output as it was, no file added.
fn failed(folder: &Folder, before: &[String], ran: &Ran) {
    assert_eq!(ran.code, Some(3), "{}", ran.stderr);
    assert_eq!(folder.read("out.csv"), OLD);
    assert_eq!(folder.files(), before);
}

/// The limit of file size stands in for a disk that fills up: it needs no rights and hits in the middle of a write.
#[cfg(unix)]
#[test]
fn disk_full_in_the_middle_of_writing() {
    let folder = with_many_stations(400);
    folder.write("out.csv", OLD);
    let before = folder.files();
    let mut shell = Command::new("sh");
    // A block of ulimit is 512 or 1024 bytes. Without the trap, the limit would kill the program instead.
    shell.args(["-c", "trap '' XFSZ; ulimit -f 4; exec \"$0\" \"$@\""]);
    let program = folder.command(HILL_RUN);
    shell
        .current_dir(folder.path(""))
        .arg(program.get_program())
        .args(program.get_args());
    let ran = folder.ran(&shell.output().unwrap());
    failed(&folder, &before, &ran);
    assert_snapshot!(ran.stderr, @"
    error: cannot write out.csv: File too large (os error 27)

    hint: free some space or write to another disk; an output that existed before is unchanged
    ");
}

/// The same with a real full disk, where the test may mount one.
#[cfg(target_os = "linux")]
#[test]
fn disk_full() {
    struct Mounted<'a>(&'a std::path::Path);
    impl Drop for Mounted<'_> {
        fn drop(&mut self) {
            let _ = Command::new("umount").arg(self.0).status();
        }
    }
    let folder = with_many_stations(2000);
    let small = Folder::new();
    let path = small.path("");
    let mounted = Command::new("mount")
        .args(["-t", "tmpfs", "-o", "size=64k", "tmpfs"])
        .arg(&path)
        .stderr(Stdio::null())
        .status();
    if !mounted.is_ok_and(|s| s.success()) {
        eprintln!("SKIPPED disk_full: mounting a small file system is not allowed here");
        return;
    }
    let _mounted = Mounted(&path);
    small.write("out.csv", OLD);
    let before = small.files();
    let words = HILL_RUN.replace("out.csv", path.join("out.csv").to_str().unwrap());
    let ran = folder.run(&words);
    failed(&small, &before, &ran);
    assert!(
        ran.stderr.contains("No space left on device"),
        "{}",
        ran.stderr
    );
}

#[cfg(target_os = "linux")]
#[test]
fn standard_output_full() {
    let folder = Folder::with_survey();
    let full = OpenOptions::new().write(true).open("/dev/full").unwrap();
    let out = folder
        .command(&HILL_RUN.replace("out.csv", "-"))
        .stdout(full)
        .output()
        .unwrap();
    let ran = folder.ran(&out);
    assert_eq!(ran.code, Some(3));
    assert_snapshot!(ran.stderr, @"
    error: cannot write to standard output: No space left on device (os error 28)

    hint: free some space or write to another disk; an output that existed before is unchanged
    ");
}

#[test]
fn a_reader_that_closes_the_pipe_is_no_error() {
    let folder = Folder::with_survey();
    let mut child = folder
        .command(&HILL_RUN.replace("out.csv", "- --quiet"))
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let ran = folder.ran(&child.wait_with_output().unwrap());
    assert_eq!((ran.code, ran.stderr.as_str()), (Some(0), ""));
}

#[cfg(unix)]
#[test]
fn interrupt_leaves_the_earlier_output_and_no_litter() {
    // Far more work than the test waits for.
    let folder = with_many_stations(300_000);
    folder.write("out.csv", OLD);
    let before = folder.files();
    let mut child = folder
        .command(&HILL_RUN.replace("--outer 800", "--outer 3000 --tolerance 0.01"))
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    let running = signal_is_caught(&child);
    assert!(running, "the program never started to listen for Ctrl-C");
    std::thread::sleep(Duration::from_millis(1500));
    interrupt(&child);
    let asked = Instant::now();
    let status = child.wait().unwrap();
    assert_eq!(status.code(), Some(130));
    assert!(
        asked.elapsed() < Duration::from_secs(60),
        "it went on for {:?}",
        asked.elapsed()
    );
    assert_snapshot!(folder.ran(&child.wait_with_output().unwrap()).stderr, @"error: interrupted, nothing was written");
    assert_eq!(folder.read("out.csv"), OLD);
    assert_eq!(folder.files(), before);
}

#[cfg(unix)]
#[test]
fn the_second_interrupt_ends_at_once() {
    let folder = Folder::with_survey();
    // A pipe nobody writes to: the program waits for the station table for ever.
    assert!(
        Command::new("mkfifo")
            .arg(folder.path("pipe.csv"))
            .status()
            .unwrap()
            .success()
    );
    let mut child = folder
        .command(&HILL_RUN.replace("stations.csv", "pipe.csv"))
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    assert!(
        signal_is_caught(&child),
        "the program never started to listen for Ctrl-C"
    );
    interrupt(&child);
    std::thread::sleep(Duration::from_millis(300));
    assert!(
        child.try_wait().unwrap().is_none(),
        "the first interrupt should wait for a good moment to stop"
    );
    interrupt(&child);
    assert_eq!(child.wait().unwrap().code(), Some(130));
}

/// Waits until the process has a handler for SIGINT.
#[cfg(unix)]
fn signal_is_caught(child: &Child) -> bool {
    let status = format!("/proc/{}/status", child.id());
    if !std::path::Path::new(&status).exists() {
        // No such table on this system: give the program time instead.
        std::thread::sleep(Duration::from_secs(1));
        return true;
    }
    let started = Instant::now();
    while started.elapsed() < Duration::from_secs(20) {
        let text = std::fs::read_to_string(&status).unwrap_or_default();
        let caught = text
            .lines()
            .find_map(|l| l.strip_prefix("SigCgt:"))
            .unwrap_or_default();
        // SIGINT is signal 2, bit 1.
        if u64::from_str_radix(caught.trim(), 16).unwrap_or(0) & 2 != 0 {
            return true;
        }
        std::thread::sleep(Duration::from_millis(5));
    }
    false
}

#[cfg(unix)]
fn interrupt(child: &Child) {
    assert!(
        Command::new("kill")
            .args(["-INT", &child.id().to_string()])
            .status()
            .unwrap()
            .success()
    );
}

/// The hill with stations spread over it.
fn with_many_stations(count: usize) -> Folder {
    let folder = Folder::new();
    folder.dem("dem.tif", &Dem::hill());
    let mut table = String::from("station,easting,northing,height\n");
    for i in 0..count {
        let (east, north) = ((i * 7919) % 1600, (i * 104_729) % 1600);
        table.push_str(&format!(
            "S{i},{},{},1100\n",
            599_225 + east,
            5_199_225 + north
        ));
    }
    folder.write("stations.csv", &table);
    folder
}
