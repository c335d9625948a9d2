//! Files that bear one plan's SOP Instance UID and hold something else: how
//! many, and a few of their names. Finding them is the batch's work.

/// So many are named; a folder of plans that were all given one UID has thousands.
const NAMED: usize = 5;

/// Files with the same SOP Instance UID and different content.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Rivals {
    count: usize,
    named: Vec<String>,
}

impl Rivals {
    /// From the names of `count` files, of which the first few are kept.
    pub fn new(count: usize, names: impl IntoIterator<Item = String>) -> Self {
        Self {
            count,
            named: names.into_iter().take(count.min(NAMED)).collect(),
        }
    }

    /// How many there are.
    #[must_use]
    pub const fn count(&self) -> usize {
        self.count
    }

    /// The first of them.
    #[must_use]
    pub fn first(&self) -> Option<&str> {
        self.named.first().map(String::as_str)
    }

    /// The first few names, and how many more there are.
    #[must_use]
    pub fn in_words(&self) -> String {
        let named = self.named.join(", ");
        match self.count.saturating_sub(self.named.len()) {
            0 => named,
            more => format!("{named} and {more} more"),
        }
    }
}
