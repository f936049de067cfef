//! An output appears whole or not at all, and nothing that stands in the way is lost.

use std::fs;
use std::io::{self, Write};
use std::path::Path;

use endgrain::error::{Error, Kind};
use endgrain::write::{Overwrite, Pending, discard_pending, finish_all};

fn create<'a>(path: &Path, overwrite: Overwrite) -> Result<Pending<'a>, Error> {
    Pending::create(path, &[], overwrite)
}

fn names(folder: &Path) -> Vec<String> {
    let mut names: Vec<String> =
        fs::read_dir(folder).unwrap().map(|entry| entry.unwrap().file_name().to_string_lossy().into_owned()).collect();
    names.sort();
    names
}

#[test]
fn a_finished_output_appears_whole() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("clean.csv");
    let mut output = create(&path, Overwrite::Refuse).unwrap();
    output.write_all(b"abc").unwrap();
    assert!(!path.exists());
    let written = output.finish().unwrap();
    assert_eq!(fs::read(&path).unwrap(), b"abc");
    // FIPS 180-2, appendix B.1: SHA-256 of "abc".
    assert_eq!(written.sha256, "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
    assert_eq!((written.bytes, written.path.as_str()), (3, path.to_str().unwrap()));
    assert_eq!(names(folder.path()), ["clean.csv"]);
}

#[test]
fn a_dropped_output_leaves_nothing() {
    let folder = tempfile::tempdir().unwrap();
    let mut output = create(&folder.path().join("a.csv"), Overwrite::Refuse).unwrap();
    output.write_all(b"half").unwrap();
    assert_eq!(names(folder.path()).len(), 1);
    drop(output);
    assert!(names(folder.path()).is_empty());
}

#[test]
fn a_file_in_the_way_is_kept_unless_forced() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("a.csv");
    fs::write(&path, "old").unwrap();
    let error = create(&path, Overwrite::Refuse).err().unwrap();
    assert_eq!(error.kind(), Kind::Io);
    assert!(error.to_string().contains("a.csv: the file exists") && error.to_string().contains("--force"), "{error}");
    // The input itself is told from any other file, under whatever name.
    let alias = folder.path().join("alias.csv");
    fs::hard_link(&path, &alias).unwrap();
    let error = Pending::create(&path, &[&alias], Overwrite::Refuse).err().unwrap();
    assert!(error.to_string().contains("the input itself"), "{error}");
    let mut output = create(&path, Overwrite::Force).unwrap();
    output.write_all(b"new").unwrap();
    assert_eq!(fs::read(&path).unwrap(), b"old");
    output.finish().unwrap();
    assert_eq!(fs::read(&path).unwrap(), b"new");
    assert_eq!(fs::read(&alias).unwrap(), b"old");
}

#[test]
fn a_file_that_appears_meanwhile_is_kept() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("a.csv");
    let output = create(&path, Overwrite::Refuse).unwrap();
    fs::write(&path, "theirs").unwrap();
    let error = output.finish().unwrap_err();
    assert!(error.to_string().contains("meanwhile"), "{error}");
    assert_eq!(fs::read(&path).unwrap(), b"theirs");
    assert_eq!(names(folder.path()), ["a.csv"]);
}

#[test]
fn what_cannot_be_written_is_refused_beforehand() {
    let folder = tempfile::tempdir().unwrap();
    let text = create(&folder.path().join("none/a.csv"), Overwrite::Refuse).err().unwrap().to_string();
    assert!(text.contains("there is no folder"), "{text}");
    let text = create(folder.path(), Overwrite::Force).err().unwrap().to_string();
    assert!(text.contains("a folder stands there"), "{text}");
    fs::write(folder.path().join("file"), "").unwrap();
    assert!(create(&folder.path().join("file/a.csv"), Overwrite::Refuse).is_err());
    for name in ["/", "..", ""] {
        assert!(create(Path::new(name), Overwrite::Refuse).is_err(), "{name:?}");
    }
}

#[cfg(unix)]
#[test]
fn links_stay_links_and_permissions_stay_too() {
    use std::os::unix::fs::PermissionsExt;
    let folder = tempfile::tempdir().unwrap();
    let (real, link) = (folder.path().join("real.csv"), folder.path().join("link.csv"));
    fs::write(&real, "old").unwrap();
    fs::set_permissions(&real, fs::Permissions::from_mode(0o640)).unwrap();
    std::os::unix::fs::symlink(&real, &link).unwrap();
    let mut output = create(&link, Overwrite::Force).unwrap();
    output.write_all(b"new").unwrap();
    output.finish().unwrap();
    assert!(fs::symlink_metadata(&link).unwrap().is_symlink());
    assert_eq!(fs::read(&real).unwrap(), b"new");
    assert_eq!(fs::metadata(&real).unwrap().permissions().mode() & 0o777, 0o640);
    // A new file is readable as any other, unlike a private temporary.
    let plain = folder.path().join("plain");
    fs::write(&plain, "").unwrap();
    let new = folder.path().join("new.csv");
    create(&new, Overwrite::Refuse).unwrap().finish().unwrap();
    let mode = |path: &Path| fs::metadata(path).unwrap().permissions().mode();
    assert_eq!(mode(&new), mode(&plain));
}

#[cfg(target_os = "linux")]
#[test]
fn devices_are_written_directly_and_a_full_one_is_named() {
    create(Path::new("/dev/null"), Overwrite::Refuse).unwrap().finish().unwrap();
    let mut output = create(Path::new("/dev/full"), Overwrite::Refuse).unwrap();
    let error = Error::from(output.write_all(b"x").unwrap_err());
    assert_eq!(error.kind(), Kind::Io);
    assert!(error.to_string().contains("No space left"), "{error}");
}

#[test]
fn a_reader_that_went_away_is_told_from_other_faults() {
    struct Gone;
    impl Write for Gone {
        fn write(&mut self, _: &[u8]) -> io::Result<usize> {
            Err(io::ErrorKind::BrokenPipe.into())
        }
        fn flush(&mut self) -> io::Result<()> {
            Ok(())
        }
    }
    let mut output = Pending::stream("-", Gone);
    let error = Error::from(output.write_all(b"x").unwrap_err());
    assert_eq!(error.kind(), Kind::Closed);
}

#[test]
fn a_batch_finishes_together() {
    let folder = tempfile::tempdir().unwrap();
    let outputs: Vec<Pending<'_>> = (0..5)
        .map(|n| {
            let mut output = create(&folder.path().join(format!("{n}.csv")), Overwrite::Refuse).unwrap();
            write!(output, "{n}").unwrap();
            output
        })
        .collect();
    fs::write(folder.path().join("3.csv"), "theirs").unwrap();
    let results = finish_all(outputs);
    assert_eq!(results.iter().map(Result::is_ok).collect::<Vec<_>>(), [true, true, true, false, true]);
    assert_eq!(names(folder.path()), ["0.csv", "1.csv", "2.csv", "3.csv", "4.csv"]);
    assert_eq!(fs::read(folder.path().join("4.csv")).unwrap(), b"4");
}

#[test]
fn an_interrupt_leaves_no_temporary_file() {
    // A process of its own: the list of pending files belongs to the whole process, and other tests run beside this one.
    let here = std::env::current_exe().unwrap();
    let folder = tempfile::tempdir().unwrap();
    if let Some(folder) = std::env::var_os("INTERRUPTED_FOLDER") {
        let path = Path::new(&folder).join("a.csv");
        let mut output = create(&path, Overwrite::Refuse).unwrap();
        output.write_all(b"half").unwrap();
        assert_eq!(names(Path::new(&folder)).len(), 1);
        discard_pending();
        std::process::exit(0);
    }
    let status = std::process::Command::new(here)
        .args(["--exact", "an_interrupt_leaves_no_temporary_file"])
        .env("INTERRUPTED_FOLDER", folder.path())
        .status()
        .unwrap();
    assert!(status.success());
    assert!(names(folder.path()).is_empty());
}
