// Package survey reads what a user brings beside the raw files: the run sheet
// (one row a measured bottle, blank or standard) and the settings. Both become
// plain values; nothing here opens a scan.
//
// Every problem of a sheet is collected and told at once, each with file, line,
// column and remedy. A setting that is not known, not allowed or not finite is an
// error with its line and what would be right.
package survey
