use super::TimeUnit;

/// Events of one recording, as a BIDS `_physioevents` table holds them: what [`write_events`] writes and
/// [`read_events`] reads.
///
/// [`write_events`]: super::write_events
/// [`read_events`]: super::read_events
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct EventTable {
    /// What onsets count.
    pub onset_source: OnsetSource,
    /// The columns after `onset`, `duration` and `trial_type`, in order.
    pub columns: Vec<EventColumn>,
    /// The events.
    pub rows: Vec<EventRow>,
}

/// What the onsets of an [`EventTable`] count (BIDS `OnsetSource`).
#[derive(Debug, Clone, PartialEq, Eq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum OnsetSource {
    /// Rows of the recording's table: the first is 0, rows before it would be negative. In the file
    /// `"n/a"`. For events found in the rows as they stand; a trace whose clock was made uniform may
    /// have other samples than the file has rows.
    Row,
    /// The values of a column of the recording's table, in the unit that they have there.
    Column {
        /// The column's name, such as `timestamp`.
        name: String,
        /// Its unit, where it is known.
        unit: Option<TimeUnit>,
    },
}

/// A column of numbers in an [`EventTable`].
#[derive(Debug, Clone, PartialEq, Eq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct EventColumn {
    /// Name; by custom small letters and underscores.
    pub name: String,
    /// Unit, as the sidecar writes it (`deg`, `deg/s`).
    pub unit: Option<String>,
    /// What the numbers are.
    pub description: Option<String>,
}

/// One event in an [`EventTable`].
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct EventRow {
    /// Onset, as the table's [`OnsetSource`] counts.
    pub onset: f64,
    /// Duration in seconds, ≥ 0; NaN where it is not known.
    pub duration: f64,
    /// Kind of event, such as `microsaccade`; empty where it is not known.
    pub trial_type: String,
    /// One value for each of the table's columns; NaN where it is not known.
    pub values: Vec<f64>,
}

impl EventTable {
    /// A table without events.
    #[must_use]
    pub fn new(onset_source: OnsetSource) -> Self {
        Self { onset_source, columns: Vec::new(), rows: Vec::new() }
    }

    /// Adds a column.
    #[must_use]
    pub fn column(mut self, column: EventColumn) -> Self {
        self.columns.push(column);
        self
    }

    /// Adds an event.
    #[must_use]
    pub fn row(mut self, row: EventRow) -> Self {
        self.rows.push(row);
        self
    }
}

impl EventColumn {
    /// A column of this name, with nothing said about it.
    #[must_use]
    pub fn new(name: impl Into<String>) -> Self {
        Self { name: name.into(), unit: None, description: None }
    }

    /// States the unit.
    #[must_use]
    pub fn unit(mut self, unit: impl Into<String>) -> Self {
        self.unit = Some(unit.into());
        self
    }

    /// Says what the numbers are.
    #[must_use]
    pub fn description(mut self, text: impl Into<String>) -> Self {
        self.description = Some(text.into());
        self
    }
}

impl EventRow {
    /// An event: `onset` as the table counts, `duration` in seconds, and no further value.
    #[must_use]
    pub fn new(onset: f64, duration: f64, trial_type: impl Into<String>) -> Self {
        Self { onset, duration, trial_type: trial_type.into(), values: Vec::new() }
    }

    /// With one value for each of the table's columns.
    #[must_use]
    pub fn values(mut self, values: impl Into<Vec<f64>>) -> Self {
        self.values = values.into();
        self
    }
}
