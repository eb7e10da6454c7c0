// Package report turns results into what people look at. Results are files:
// the tables of an output folder (Schema) and survey.nc (Store). Everything a
// person sees, the workbook, the page and the pictures, is rendered from those
// files by Render, so that a report made again from an old folder takes the same
// route and gives the same bytes as the one made with the results.
package report
