//! What the README shows is what the program does.

use std::path::Path;
use std::process::Command;

type Outcome = Result<(), Box<dyn std::error::Error>>;

/// Where the README leaves out the rest of an output.
const REST: &str = "...";

fn readme() -> Result<String, std::io::Error> {
    std::fs::read_to_string(Path::new(env!("CARGO_MANIFEST_DIR")).join("README.md"))
}

/// The blocks of the README fenced with the given word.
fn blocks<'t>(text: &'t str, word: &str) -> Vec<&'t str> {
    let fence = format!("```{word}\n");
    text.split(fence.as_str())
        .skip(1)
        .filter_map(|rest| rest.split("```").next())
        .collect()
}

fn identify(arguments: &[&str]) -> Result<(i32, String), Box<dyn std::error::Error>> {
    let output = Command::new(env!("CARGO_BIN_EXE_linstock"))
        .current_dir(env!("CARGO_MANIFEST_DIR"))
        .args(arguments)
        .output()?;
    let text = String::from_utf8(output.stdout)?;
    Ok((output.status.code().unwrap_or(-1), text))
}

#[test]
fn the_first_command_gives_the_output_shown() -> Outcome {
    let readme = readme()?;
    let shown = blocks(&readme, "console")[0];
    let (command, output) = shown.split_once('\n').ok_or("no output shown")?;
    let arguments: Vec<&str> = command
        .strip_prefix("$ cargo run --release -- ")
        .ok_or("another command")?
        .split(' ')
        .collect();
    let (status, found) = identify(&arguments)?;
    assert_eq!(status, 0);
    let shown: Vec<&str> = output.lines().take_while(|l| *l != REST).collect();
    let found: Vec<&str> = found.lines().take(shown.len()).collect();
    assert!(shown.len() > 20);
    assert_eq!(shown, found);
    Ok(())
}

#[test]
fn the_readings_and_the_set_up_shown_can_be_used() -> Outcome {
    let readme = readme()?;
    let folder = tempfile::tempdir()?;
    let readings = folder.path().join("readings.csv");
    let setup = folder.path().join("setup.toml");
    std::fs::write(&readings, blocks(&readme, "csv")[0])?;
    std::fs::write(&setup, blocks(&readme, "toml")[0])?;
    let paths = [readings, setup].map(|p| p.to_string_lossy().into_owned());
    let (status, text) = identify(&["identify", &paths[0], "--setup", &paths[1], "--exit-zero"])?;
    assert_eq!(status, 0, "{text}");
    Ok(())
}

#[test]
fn every_named_list_is_in_the_library_and_the_other_way_round() -> Outcome {
    let readme = readme()?;
    let lists = include_str!("../library/lists.csv");
    let named: std::collections::BTreeSet<&str> = lists
        .lines()
        .skip(1)
        .filter_map(|line| line.split(',').next())
        .collect();
    for list in named {
        assert!(readme.contains(&format!("`{list}`")), "{list}");
    }
    Ok(())
}

#[test]
fn files_it_links_to_are_there() -> Outcome {
    for target in readme()?
        .split("](")
        .skip(1)
        .filter_map(|t| t.split(')').next())
    {
        assert!(
            Path::new(env!("CARGO_MANIFEST_DIR")).join(target).exists(),
            "{target}"
        );
    }
    Ok(())
}
