//! `crenate lint --mend` as a user and a CI job meet it.
#![allow(missing_docs, clippy::unwrap_used)]

mod cli;

use std::fs;

use cli::{Folder, run, run_with_input, stderr, stdout};

const BROKEN: &str = "\
crystal ripple # kept
  mass      0.07 me
  lattice   chain 8 nm × 1
  fourier   1 = 20 meV phase 0.5
";
const MENDED: &str = "\
crystal ripple # kept
  mass      0.07 me
  lattice   chain 8 nm * 1
  fourier   1 = 20 meV phase 0.5
  fourier -1 = 20 meV phase -0.5
";
/// A slip whose fix needs a look.
const SLIPPED: &str = "crystal slip\n  mass 0.07 u\n  lattice chain 8 nm\n  cosine 1 = 20 meV\n";

#[test]
fn safe_fixes_are_written_and_the_rest_reported() {
    let folder = Folder::new();
    folder.write("a.cren", BROKEN);
    folder.write("slip.cren", SLIPPED);
    let output = run(&folder, &["lint", "--mend", "--fail-on", "warning"]);
    assert_eq!(output.status.code(), Some(1), "{}", stderr(&output));
    assert_eq!(folder.read("a.cren"), MENDED);
    assert_eq!(folder.read("slip.cren"), SLIPPED);
    assert!(stdout(&output).contains("unit-slip"), "{}", stdout(&output));
    assert!(
        !stdout(&output).contains("lone-component"),
        "{}",
        stdout(&output)
    );
    assert!(
        stderr(&output).contains("mended a.cren"),
        "{}",
        stderr(&output)
    );
    let again = run(&folder, &["lint", "--mend", "a.cren"]);
    assert_eq!(
        (again.status.code(), stderr(&again)),
        (Some(0), String::new())
    );
    assert_eq!(folder.read("a.cren"), MENDED);
    let left: Vec<_> = fs::read_dir(folder.root()).unwrap().collect();
    assert_eq!(left.len(), 2, "{left:?}");
}

#[test]
fn a_dry_run_prints_a_diff_and_writes_nothing() {
    let folder = Folder::new();
    folder.write("sub/a.cren", BROKEN);
    let output = run(&folder, &["lint", "--mend", "--dry-run"]);
    assert_eq!(output.status.code(), Some(1));
    let wanted = "\
--- a/sub/a.cren
+++ b/sub/a.cren
@@ -1,4 +1,5 @@
 crystal ripple # kept
   mass      0.07 me
-  lattice   chain 8 nm × 1
+  lattice   chain 8 nm * 1
   fourier   1 = 20 meV phase 0.5
+  fourier -1 = 20 meV phase -0.5
";
    assert_eq!(stdout(&output), wanted);
    assert_eq!(folder.read("sub/a.cren"), BROKEN);
    folder.write("sub/a.cren", MENDED);
    let output = run(&folder, &["lint", "--mend", "--dry-run"]);
    assert_eq!(
        (output.status.code(), stdout(&output)),
        (Some(0), String::new())
    );
    assert_eq!(run(&folder, &["lint", "--dry-run"]).status.code(), Some(2));
}

#[test]
fn what_cannot_be_read_whole_is_left_alone() {
    let folder = Folder::new();
    let bytes = [BROKEN.as_bytes(), b"  title \"caf\xe9\"\n"].concat();
    folder.write_bytes("latin.cren", &bytes);
    folder.write("a.cren", BROKEN);
    let output = run(&folder, &["lint", "--mend"]);
    assert_eq!(output.status.code(), Some(2));
    assert!(
        stderr(&output).contains("not text in UTF-8"),
        "{}",
        stderr(&output)
    );
    assert_eq!(fs::read(folder.path("latin.cren")).unwrap(), bytes);
    assert_eq!(folder.read("a.cren"), MENDED);
    assert_eq!(
        run(&folder, &["lint", "--mend", "--dry-run"]).status.code(),
        Some(2)
    );
}

#[test]
fn standard_input_is_refused() {
    let folder = Folder::new();
    let output = run_with_input(&folder, &["lint", "--mend", "-"], BROKEN);
    assert_eq!(output.status.code(), Some(2));
    assert!(
        stderr(&output).contains("cannot rewrite standard input"),
        "{}",
        stderr(&output)
    );
}

#[test]
fn files_outside_the_selection_are_not_touched() {
    let folder = Folder::new();
    let materials = "material basin\n  mass 0.07 me × 1\n  edge 0 meV\n";
    folder.write("materials.cren", materials);
    folder.write("other.cren", BROKEN);
    let user =
        "use \"materials.cren\"\n\ncrystal a\n  layer 5 nm of basin\n  layer 3 nm × 1 at 200 meV\n";
    folder.write("a.cren", user);
    run(&folder, &["lint", "--mend", "a.cren"]);
    assert_eq!(folder.read("materials.cren"), materials);
    assert_eq!(folder.read("other.cren"), BROKEN);
    assert_eq!(folder.read("a.cren"), user.replace('×', "*"));
    // Of two parts, one alone is mended.
    folder.write("a.cren", user);
    run(&folder, &["lint", "--mend", "--shard", "2/3"]);
    assert_eq!(folder.read("a.cren"), user);
    assert_eq!(folder.read("materials.cren"), materials.replace('×', "*"));
    assert_eq!(folder.read("other.cren"), BROKEN);
}

#[test]
fn only_the_chosen_crystals_are_mended() {
    let folder = Folder::new();
    let other = BROKEN.replace("ripple", "swell");
    folder.write("a.cren", &format!("{BROKEN}\n{other}"));
    run(&folder, &["lint", "--mend", "--only", "swell", "a.cren"]);
    let mended = MENDED.replace("ripple", "swell");
    assert_eq!(folder.read("a.cren"), format!("{BROKEN}\n{mended}"));
}

#[test]
fn a_byte_order_mark_and_line_ends_are_kept() {
    let folder = Folder::new();
    let windows = |text: &str| format!("\u{feff}{}", text.replace('\n', "\r\n"));
    folder.write("a.cren", &windows(BROKEN));
    assert_eq!(run(&folder, &["lint", "--mend"]).status.code(), Some(0));
    assert_eq!(folder.read("a.cren"), windows(MENDED));
}

#[cfg(unix)]
#[test]
fn permissions_and_links_are_kept() {
    use std::os::unix::fs::{PermissionsExt, symlink};
    let folder = Folder::new();
    folder.write("real.cren", BROKEN);
    fs::set_permissions(folder.path("real.cren"), fs::Permissions::from_mode(0o640)).unwrap();
    symlink("real.cren", folder.path("link.cren")).unwrap();
    run(&folder, &["lint", "--mend", "link.cren"]);
    assert_eq!(folder.read("real.cren"), MENDED);
    let mode = fs::metadata(folder.path("real.cren"))
        .unwrap()
        .permissions()
        .mode();
    assert_eq!(mode & 0o777, 0o640);
    assert!(
        fs::symlink_metadata(folder.path("link.cren"))
            .unwrap()
            .is_symlink()
    );
}
