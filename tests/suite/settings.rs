//! The site file: the shipped example is the built-in defaults, and what makes
//! no sense is refused by key.

use counterfoil::settings::Site;

const EXAMPLE: &str = include_str!("../../beam-models/site-example.toml");

#[test]
fn verify_the_shipped_example_equals_the_defaults() {
    let site = Site::parse(EXAMPLE, "site-example.toml").unwrap();
    assert_eq!(site, Site::default());
}

#[test]
fn verify_keys_left_out_keep_their_defaults() {
    let site = Site::parse("[technical]\nedge_margin_cm = 2.0\n", "x").unwrap();
    assert_eq!(site.technical.edge_margin_cm, 2.0);
    assert_eq!(site.action_levels, Site::default().action_levels);
}

#[test]
fn verify_an_unknown_key_is_an_error_that_names_it() {
    let error = Site::parse("[technical]\nedge_margin_mm = 10\n", "my.toml").unwrap_err();
    let text = error.to_string();
    assert!(
        text.contains("my.toml") && text.contains("edge_margin_mm"),
        "{text}"
    );
}

#[test]
fn verify_levels_that_could_let_anything_pass_are_refused() {
    for (tolerance, action) in [
        ("300.0", "500.0"),
        ("0.0", "5.0"),
        ("-3.0", "5.0"),
        ("3.0", "2.0"),
        ("nan", "5.0"),
        ("3.0", "nan"),
        ("3.0", "inf"),
    ] {
        let text = format!(
            "[action_levels.static]\ntolerance_percent = {tolerance}\naction_percent = {action}\nbasis = \"x\"\n"
        );
        let error = Site::parse(&text, "x").unwrap_err().to_string();
        assert!(error.contains("action_levels.static"), "{error}");
    }
}

/// A device delivers without end; a file of this size holds no rules.
#[cfg(unix)]
#[test]
fn verify_a_site_file_without_end_is_refused() {
    let error = Site::load(std::path::Path::new("/dev/zero")).unwrap_err();
    let cause = std::error::Error::source(&error).unwrap().to_string();
    assert!(cause.contains("larger than"), "{cause}");
}
