//! The README shows real commands with their real output.

use assert_cmd::Command;

const README: &str = concat!(env!("CARGO_MANIFEST_DIR"), "/README.md");

fn readme() -> String {
    std::fs::read_to_string(README).unwrap()
}

fn command() -> Command {
    let mut command = Command::cargo_bin("dutybank").unwrap();
    command.current_dir(env!("CARGO_MANIFEST_DIR"));
    command
}

/// Trailing spaces aside, which an editor may take away.
fn tidy(text: &str) -> String {
    text.lines()
        .map(str::trim_end)
        .collect::<Vec<_>>()
        .join("\n")
        .trim()
        .to_owned()
}

/// `UPDATE_EXPECTED=1` writes what is printed now into the README; look at it.
#[test]
fn every_console_block_is_what_the_command_prints() {
    let readme = readme();
    let mut updated = readme.clone();
    let blocks: Vec<&str> = readme.split("```console\n").skip(1).collect();
    assert!(blocks.len() >= 2);
    let update = std::env::var_os("UPDATE_EXPECTED").is_some();
    for block in blocks {
        let block = block.split("```").next().unwrap();
        let (line, shown) = block.split_once('\n').unwrap();
        let arguments = line.strip_prefix("$ dutybank ").unwrap().split_whitespace();
        let output = command().args(arguments).output().unwrap();
        let printed = tidy(&String::from_utf8(output.stdout).unwrap());
        if update {
            updated = updated.replace(block, &format!("{line}\n{printed}\n"));
        } else {
            assert_eq!(printed, tidy(shown), "{line}");
        }
    }
    if update {
        std::fs::write(README, updated).unwrap();
    }
}

#[test]
fn the_starter_stands_in_it_as_it_is_shipped() {
    let starter = std::fs::read_to_string(concat!(
        env!("CARGO_MANIFEST_DIR"),
        "/networks/starter.yaml"
    ))
    .unwrap();
    assert!(readme().contains(starter.trim_end()));
}

#[test]
fn the_mistake_shown_is_told_as_shown() {
    let starter = std::fs::read_to_string(concat!(
        env!("CARGO_MANIFEST_DIR"),
        "/networks/starter.yaml"
    ))
    .unwrap();
    let wrong = starter.replace("to: outfall", "to: outfal");
    let output = command()
        .args(["check", "-"])
        .write_stdin(wrong)
        .output()
        .unwrap();
    assert_eq!(output.status.code(), Some(2));
    let printed = String::from_utf8(output.stderr).unwrap();
    assert!(readme().contains(&tidy(&printed)), "{printed}");
}

#[test]
fn the_commands_at_the_top_are_those_of_the_checks() {
    let checks = std::fs::read_to_string(concat!(env!("CARGO_MANIFEST_DIR"), "/.ci/run")).unwrap();
    assert!(
        readme().contains("\ncargo test --release\n") && checks.contains("\ncargo test --release")
    );
    command()
        .args(["duty", "networks/mill_pond_transfer.yaml"])
        .assert()
        .success();
}
