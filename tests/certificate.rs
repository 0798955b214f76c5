//! Certificates: what is hashed, what is refused, and files that are written entirely or not at all.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use coneproof::certificate::Certificate;
use coneproof::packets::BoxPacket;
use coneproof::quantities::tail::TailRequest;
use serde_json::Value;
use sha2::{Digest, Sha256};
use std::collections::BTreeMap;
use std::fs;
use std::path::Path;
use std::process::{Command, Output};

fn certificate(half_width: &str, time: &str, beyond: Option<&str>) -> Certificate {
    let packet = BoxPacket::new(half_width.parse().unwrap()).unwrap();
    let mut request = TailRequest::new(packet, "1".parse().unwrap(), time.parse().unwrap()).unwrap();
    request.beyond = beyond.map(|region| region.parse().unwrap());
    Certificate::new(&request, &request.certify().unwrap()).unwrap()
}

fn program(args: &str, file: &Path) -> Output {
    let binary = assert_cmd::cargo::cargo_bin("coneproof");
    Command::new(binary).args(args.split(' ')).arg("--certificate").arg(file).output().unwrap()
}

/// RFC 8785 for objects with ASCII names, strings without control characters, and whole numbers.
fn canonical(value: &Value) -> String {
    match value {
        Value::Object(members) => {
            let sorted: BTreeMap<&String, &Value> = members.iter().collect();
            let members = sorted.into_iter().map(|(name, value)| format!("\"{name}\":{}", canonical(value)));
            format!("{{{}}}", members.collect::<Vec<_>>().join(","))
        }
        Value::Array(list) => format!("[{}]", list.iter().map(canonical).collect::<Vec<_>>().join(",")),
        Value::String(text) => format!("\"{}\"", text.replace('\\', "\\\\").replace('"', "\\\"")),
        other => other.to_string(),
    }
}

const REQUEST: &str = "tail box --half-width 1 --time 1 --beyond 3";

#[test]
fn the_hash_is_that_of_the_canonical_content() {
    for document in
        [certificate("1", "1", None), certificate("[0.9, 1.1]", "-2", Some("5")), certificate("1", "0", None)]
    {
        let mut value: Value = serde_json::from_str(&document.to_json().unwrap()).unwrap();
        let stated = value.as_object_mut().unwrap().remove("sha256").unwrap();
        let content = canonical(&value);
        assert_eq!(document.canonical_content().unwrap(), content);
        let digest: String = Sha256::digest(content).iter().map(|byte| format!("{byte:02x}")).collect();
        assert_eq!(stated, digest);
    }
}

#[test]
fn every_changed_digit_is_found() {
    let text = certificate("1", "1", None).to_json().unwrap();
    assert!(Certificate::from_json(&text).is_ok());
    let mut changed = 0;
    for (place, byte) in text.bytes().enumerate().filter(|(_, byte)| byte.is_ascii_digit()) {
        let mut other = text.clone().into_bytes();
        other[place] = if byte == b'9' { b'0' } else { byte + 1 };
        assert!(Certificate::from_json(&String::from_utf8(other).unwrap()).is_err(), "byte {place}");
        changed += 1;
    }
    assert!(changed > 400, "only {changed} digits");
}

#[test]
fn content_changes_the_hash_and_layout_does_not() {
    let document = certificate("1", "1", Some("3"));
    for change in [
        |c: &mut Certificate| c.lower.push('1'),
        |c: &mut Certificate| c.digits += 1,
        |c: &mut Certificate| c.inputs.set("mass", "2"),
        |c: &mut Certificate| c.routes[0].witness[0].value.push('1'),
        |c: &mut Certificate| c.routes.swap(0, 1),
        |c: &mut Certificate| c.value = None,
        |c: &mut Certificate| c.notes.push("remark".to_owned()),
        |c: &mut Certificate| c.program_version.push('1'),
    ] {
        let mut other = document.clone();
        change(&mut other);
        assert_ne!(other.content_hash().unwrap(), document.sha256);
        assert!(Certificate::from_json(&other.to_json().unwrap()).is_err());
    }
    let value: Value = serde_json::from_str(&document.to_json().unwrap()).unwrap();
    let backwards: serde_json::Map<String, Value> =
        value.as_object().unwrap().iter().rev().map(|(name, value)| (name.clone(), value.clone())).collect();
    assert_eq!(Certificate::from_json(&serde_json::to_string(&backwards).unwrap()), Ok(document));
}

#[test]
fn documents_of_another_shape_are_refused() {
    let value: Value = serde_json::from_str(&certificate("1", "1", None).to_json().unwrap()).unwrap();
    for name in value.as_object().unwrap().keys() {
        let mut shorter = value.clone();
        shorter.as_object_mut().unwrap().remove(name);
        assert!(Certificate::from_json(&shorter.to_string()).is_err(), "without {name}");
    }
    for name in ["note", "witness"] {
        let mut shorter = value.clone();
        shorter["routes"][0].as_object_mut().unwrap().remove(name);
        assert!(Certificate::from_json(&shorter.to_string()).is_err(), "a route without {name}");
        // Even with a hash that fits.
        shorter.as_object_mut().unwrap().remove("sha256");
        let digest: String = Sha256::digest(canonical(&shorter)).iter().map(|byte| format!("{byte:02x}")).collect();
        shorter["sha256"] = digest.into();
        assert!(Certificate::from_json(&shorter.to_string()).is_err(), "a route without {name}");
    }
    // A forger who computes the hash anew is still held to the order of the bounds.
    let mut forged = certificate("1", "1", None);
    std::mem::swap(&mut forged.lower, &mut forged.upper);
    forged.sha256 = forged.content_hash().unwrap();
    assert!(
        Certificate::from_json(&forged.to_json().unwrap()).unwrap_err().to_string().contains("the lower one first")
    );
    for text in ["", "{", "[]", "null", "{\"format\": \"coneproof-certificate\"}"] {
        assert!(Certificate::from_json(text).is_err(), "{text:?}");
    }
    let mut added = value.clone();
    added["seconds"] = 1.into();
    assert!(Certificate::from_json(&added.to_string()).is_err());
    let twice = value.to_string().replacen('{', "{\"digits\":15,", 1);
    assert!(Certificate::from_json(&twice).is_err());
}

#[test]
fn tails_of_any_size_can_be_read_back() {
    for region in ["115133", "3000000"] {
        let document = certificate("1", "1", Some(region));
        assert!(document.lower.contains("e-"));
        assert_eq!(Certificate::from_json(&document.to_json().unwrap()), Ok(document));
    }
}

#[test]
fn certificates_fit_the_schema() {
    let binary = assert_cmd::cargo::cargo_bin("coneproof");
    let printed = Command::new(binary).args(["schema", "certificate"]).output().unwrap();
    let validator = jsonschema::validator_for(&serde_json::from_slice(&printed.stdout).unwrap()).unwrap();
    for document in
        [certificate("1", "1", None), certificate("[1, 2]", "[-1, 3]", Some("5")), certificate("1", "0", None)]
    {
        let value: Value = serde_json::from_str(&document.to_json().unwrap()).unwrap();
        let errors: Vec<String> = validator.iter_errors(&value).map(|error| error.to_string()).collect();
        assert!(errors.is_empty(), "{errors:?}");
        for (name, _) in value.as_object().unwrap() {
            let mut other = value.clone();
            other[name] = serde_json::json!({ "unknown": 1 });
            assert!(!validator.is_valid(&other), "{name} may be anything");
        }
    }
}

#[test]
fn two_runs_write_the_same_bytes() {
    let folder = tempfile::tempdir().unwrap();
    let (one, two) = (folder.path().join("one.json"), folder.path().join("two.json"));
    for file in [&one, &two] {
        let output = program(REQUEST, file);
        assert_eq!((output.status.code(), output.stderr.len()), (Some(0), 0));
    }
    assert_eq!(fs::read(&one).unwrap(), fs::read(&two).unwrap());
    assert!(Certificate::read(&one).is_ok());
}

#[test]
fn a_certificate_says_what_the_answer_says() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("c.json");
    let output = program(&format!("{REQUEST} --format json"), &file);
    let answer: Value = serde_json::from_slice(&output.stdout).unwrap();
    let written: Value = serde_json::from_slice(&fs::read(&file).unwrap()).unwrap();
    for name in ["quantity", "inputs", "lower", "upper", "value", "digits", "status", "notes", "caution"] {
        assert_eq!(answer[name], written[name], "{name}");
    }
    for (shown, kept) in answer["routes"].as_array().unwrap().iter().zip(written["routes"].as_array().unwrap()) {
        for name in ["name", "lower", "upper", "bits", "nodes", "note"] {
            assert_eq!(shown[name], kept[name], "{name}");
        }
        assert!(kept["witness"].as_array().unwrap().len() > 2);
    }
}

#[test]
fn places_that_cannot_be_written_are_refused_before_computing() {
    let folder = tempfile::tempdir().unwrap();
    let kept = folder.path().join("kept.json");
    fs::write(&kept, "kept").unwrap();
    let mut permissions = fs::metadata(&kept).unwrap().permissions();
    permissions.set_readonly(true);
    fs::set_permissions(&kept, permissions).unwrap();
    // At ten thousand digits a computation would take minutes.
    let long = "tail box --half-width 1 --time 1 --digits 10000";
    let start = std::time::Instant::now();
    for place in [folder.path(), &kept, &kept.join("c.json"), &folder.path().join("no/c.json"), Path::new("")] {
        let output = program(long, place);
        let complaint = String::from_utf8_lossy(&output.stderr).into_owned();
        assert_eq!((output.status.code(), output.stdout.len()), (Some(2), 0), "{place:?}");
        assert!(complaint.starts_with("coneproof: certificate"), "{place:?}: {complaint}");
    }
    assert!(start.elapsed().as_secs() < 20);
    assert_eq!(fs::read_to_string(&kept).unwrap(), "kept");
}

#[test]
fn a_refused_request_leaves_an_older_file_alone() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("c.json");
    fs::write(&file, "older").unwrap();
    assert_eq!(program("tail box --half-width 1 --time 1 --mass -1", &file).status.code(), Some(2));
    assert_eq!(fs::read_to_string(&file).unwrap(), "older");
    assert_eq!(fs::read_dir(&folder).unwrap().count(), 1);
}

#[test]
fn a_reader_never_sees_half_a_file() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("c.json");
    let documents = [certificate("1", "1", None), certificate("1", "1", Some("3"))];
    documents[0].write(&file).unwrap();
    let writer = std::thread::spawn({
        let (file, documents) = (file.clone(), documents.clone());
        move || (0..300).for_each(|round| documents[round % 2].write(&file).unwrap())
    });
    let mut read = 0;
    while !writer.is_finished() || read == 0 {
        let found = Certificate::read(&file).unwrap();
        assert!(documents.contains(&found));
        read += 1;
    }
    writer.join().unwrap();
    assert_eq!(fs::read_dir(&folder).unwrap().count(), 1);
}

#[cfg(unix)]
mod unix {
    use super::*;
    use std::os::unix::fs::{PermissionsExt, symlink};

    /// Runs the program where no file may grow, as on a full disk.
    fn without_room(prelude: &str, file: &Path) -> Output {
        let binary = assert_cmd::cargo::cargo_bin("coneproof");
        let script = format!("{prelude}; ulimit -f 0; exec \"$0\" {REQUEST} --certificate \"$1\"");
        Command::new("sh").arg("-c").arg(script).arg(binary).arg(file).output().unwrap()
    }

    #[test]
    fn a_full_disk_leaves_the_older_file_and_the_answer() {
        let folder = tempfile::tempdir().unwrap();
        let file = folder.path().join("c.json");
        fs::write(&file, "older").unwrap();
        let output = without_room("trap '' XFSZ", &file);
        assert_eq!(output.status.code(), Some(2));
        assert!(String::from_utf8_lossy(&output.stderr).starts_with("coneproof: cannot write \""));
        // The computation is not lost.
        let answer = String::from_utf8_lossy(&output.stdout).into_owned();
        assert!(answer.contains("value ") && answer.contains("no certificate was written"), "{answer}");
        assert_eq!(fs::read_to_string(&file).unwrap(), "older");
        assert_eq!(fs::read_dir(&folder).unwrap().count(), 1, "a temporary file is left");
    }

    #[test]
    fn a_program_killed_while_writing_leaves_the_older_file() {
        let folder = tempfile::tempdir().unwrap();
        let file = folder.path().join("c.json");
        fs::write(&file, "older").unwrap();
        let output = without_room("trap - XFSZ", &file);
        assert_eq!(output.status.code(), None, "the signal was expected to end the program");
        assert_eq!(fs::read_to_string(&file).unwrap(), "older");
    }

    #[test]
    fn links_are_followed_and_permissions_kept() {
        let folder = tempfile::tempdir().unwrap();
        let (file, link) = (folder.path().join("c.json"), folder.path().join("link.json"));
        fs::write(&file, "older").unwrap();
        fs::set_permissions(&file, fs::Permissions::from_mode(0o640)).unwrap();
        symlink(&file, &link).unwrap();
        certificate("1", "0", None).write(&link).unwrap();
        assert!(fs::symlink_metadata(&link).unwrap().is_symlink());
        assert!(Certificate::read(&file).is_ok());
        assert_eq!(fs::metadata(&file).unwrap().permissions().mode() & 0o777, 0o640);
    }

    #[test]
    fn devices_are_refused() {
        assert!(certificate("1", "0", None).write(Path::new("/dev/full")).is_err());
        assert_eq!(program(REQUEST, Path::new("/dev/null")).status.code(), Some(2));
    }
}
