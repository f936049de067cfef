//! Which line of the file each sample stands on, kept as runs so that a regular file costs nothing.

/// Line numbers (from 1) of the rows of a table. Blank lines, dropped rows and rows over several lines make gaps; rows on
/// every line, or on every second line, are one run.
///
/// Lines ascend strictly with rows.
#[derive(Debug, Clone, Default)]
pub struct RowLines {
    runs: Vec<Run>,
    rows: u64,
}

/// Rows `row`, `row + 1`, ... on lines `line`, `line + stride`, ...
#[derive(Debug, Clone, Copy)]
struct Run {
    row: u64,
    line: u64,
    stride: u64,
}

impl RowLines {
    /// No rows yet.
    pub fn new() -> RowLines {
        RowLines::default()
    }

    /// `rows` rows on consecutive lines from `first_line` on.
    pub fn consecutive(first_line: u64, rows: u64) -> RowLines {
        let runs = if rows == 0 { Vec::new() } else { vec![Run { row: 0, line: first_line, stride: 1 }] };
        RowLines { runs, rows }
    }

    /// Number of rows.
    pub fn rows(&self) -> u64 {
        self.rows
    }

    /// Line (from 1) of row `row` (from 0), where there is such a row.
    pub fn line(&self, row: u64) -> Option<u64> {
        if row >= self.rows {
            return None;
        }
        let run = self.runs[self.runs.partition_point(|run| run.row <= row) - 1];
        Some(run.line + (row - run.row) * run.stride)
    }

    /// Row (from 0) that starts on line `line`, where one does.
    pub fn row(&self, line: u64) -> Option<u64> {
        let after = self.runs.partition_point(|run| run.line <= line);
        let run = self.runs[..after].last()?;
        let end = self.runs.get(after).map_or(self.rows, |next| next.row);
        let row = run.row + (line - run.line) / run.stride;
        ((line - run.line).is_multiple_of(run.stride) && row < end).then_some(row)
    }

    /// Adds a row on `line`, which lies below all lines so far.
    pub fn push(&mut self, line: u64) {
        self.push_run(1, line, 1);
    }

    /// Adds `rows` rows on consecutive lines from `line` on.
    pub fn push_consecutive(&mut self, line: u64, rows: u64) {
        if rows > 0 {
            self.push_run(rows, line, 1);
        }
    }

    /// Adds all rows of `block`, whose lines count from `offset` on.
    pub fn append(&mut self, block: &RowLines, offset: u64) {
        for (index, run) in block.runs.iter().enumerate() {
            let end = block.runs.get(index + 1).map_or(block.rows, |next| next.row);
            self.push_run(end - run.row, run.line + offset, run.stride);
        }
    }

    /// Keeps the first `rows` rows.
    pub fn truncate(&mut self, rows: u64) {
        if rows < self.rows {
            self.rows = rows;
            self.runs.truncate(self.runs.partition_point(|run| run.row < rows));
        }
    }

    fn push_run(&mut self, rows: u64, line: u64, stride: u64) {
        let row = self.rows;
        self.rows += rows;
        let Some(last) = self.runs.last_mut() else {
            self.runs.push(Run { row, line, stride });
            return;
        };
        let held = row - last.row;
        // A run of one row has no stride yet: it takes the distance to the next row.
        let step = if held == 1 { line - last.line } else { last.stride };
        if line == last.line + held * step && (rows == 1 || stride == step) {
            last.stride = step;
        } else {
            self.runs.push(Run { row, line, stride });
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_row_finds_its_line_and_back() {
        let lines = [3, 4, 5, 7, 9, 11, 12, 20, 21, 22];
        let mut whole = RowLines::new();
        lines.iter().for_each(|&line| whole.push(line));
        for split in 0..=lines.len() {
            let (mut head, mut tail) = (RowLines::new(), RowLines::new());
            lines[..split].iter().for_each(|&line| head.push(line));
            lines[split..].iter().for_each(|&line| tail.push(line - 2));
            head.append(&tail, 2);
            for rows in [&whole, &head] {
                for (row, &line) in lines.iter().enumerate() {
                    assert_eq!(rows.line(row as u64), Some(line));
                    assert_eq!(rows.row(line), Some(row as u64));
                }
                assert_eq!(rows.line(lines.len() as u64), None);
                assert!([1, 2, 6, 8, 10, 13, 19, 23].iter().all(|&line| rows.row(line).is_none()));
            }
        }
    }

    #[test]
    fn regular_rows_are_one_run() {
        let mut every_second = RowLines::new();
        (0..1000).for_each(|row| every_second.push(5 + 2 * row));
        assert_eq!(every_second.runs.len(), 1);
        every_second.truncate(10);
        assert_eq!((every_second.rows(), every_second.line(9), every_second.line(10)), (10, Some(23), None));
    }
}
