//! What is handed out: charts and tables as files.

pub mod table;
