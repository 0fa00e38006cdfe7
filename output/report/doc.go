// Package report makes the page that people read: report.html, one self-contained
// file with the answer in words, charts with the tables behind them, accuracy,
// assumptions and provenance, and the same charts as files of their own.
//
// It is handed tables and texts and knows nothing of how they were made. What a
// table does not have is left out. A page is the same bytes for the same tables: it
// holds no clock time.
//
// Charts are drawn once, by [draw], on a painter: as SVG for the page, whose colours
// follow the reader's light or dark theme, as SVG for files, with colours of its
// own, and as PNG. The page's script only shows one view of a chart in place of
// another, reads values out and makes CSV files; without it the first view and its
// table are there.
//
// Text from a scenario (titles, group names, currencies) is escaped wherever it
// appears, and the page's Content-Security-Policy allows its own script and style,
// by their hashes, and nothing else.
package report
