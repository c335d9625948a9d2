//! The time of the run.

use anyhow::Context;

/// Now, or SOURCE_DATE_EPOCH (seconds since 1970, UTC) for outputs that must be repeatable to the byte.
pub(super) fn started() -> anyhow::Result<jiff::ZonedDateTime> {
    match std::env::var("SOURCE_DATE_EPOCH") {
        Ok(seconds) => {
            let seconds: i64 = seconds
                .trim()
                .parse()
                .with_context(|| format!("SOURCE_DATE_EPOCH is {seconds:?}, must be seconds"))?;
            let instant = jiff::Timestamp::from_second(seconds).context("SOURCE_DATE_EPOCH")?;
            Ok(instant.to_zoned_datetime(jiff::tz::TimeZone::UTC))
        }
        Err(_) => Ok(jiff::ZonedDateTime::now().round(jiff::Unit::Second)?),
    }
}
