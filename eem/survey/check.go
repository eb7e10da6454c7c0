package survey

import (
	"slices"
	"strings"

	"golang.org/x/text/unicode/norm"

	"tarnlight/eem"
	"tarnlight/eem/scanfile"
)

// foldID maps ids that file systems or people cannot tell apart to one text: case
// and the way in which accents are encoded are ignored.
func foldID(id string) string {
	return norm.NFC.String(strings.ToLower(strings.ToUpper(norm.NFC.String(id))))
}

// index finds rows by id and reports ids that are not unique.
func (r *sheetReader) index() {
	r.ids = make(map[string]int)
	folded := make(map[string]int)
	for i := range r.sheet.Rows {
		row := &r.sheet.Rows[i]
		if row.ID == "" {
			continue
		}
		if j, twice := folded[foldID(row.ID)]; twice {
			other := &r.sheet.Rows[j]
			if other.ID == row.ID {
				r.add(row.Line, "id", "%s stands in line %d too; give each bottle an id of its own, and name a repetition under replicate_of", quote(row.ID), other.Line)
			} else {
				r.add(row.Line, "id", "%s differs from %s in line %d only in case or in how an accent is written; give one of them another id", quote(row.ID), quote(other.ID), other.Line)
			}
		} else {
			folded[foldID(row.ID)] = i
		}
		if _, ok := r.ids[row.ID]; !ok {
			r.ids[row.ID] = i
		}
	}
}

// noRow says that an id is not in the sheet, in a row with the id self. The nearest
// one is looked for only while few problems are there, since that takes the time
// of a whole pass.
func (r *sheetReader) noRow(id, self string) string {
	msg := "there is no row with the id " + quote(id)
	if len(r.problems) < maxProblems {
		all := make([]string, 0, len(r.sheet.Rows))
		for i := range r.sheet.Rows {
			if other := r.sheet.Rows[i].ID; other != self {
				all = append(all, other)
			}
		}
		if near, ok := nearest(id, all); ok {
			return msg + "; did you mean " + quote(near) + "?"
		}
	}
	return msg + "; write an id of this sheet"
}

// checkRows checks rows against each other and the settings.
func (r *sheetReader) checkRows() {
	for i := range r.sheet.Rows {
		row := &r.sheet.Rows[i]
		if row.Scans == "" && row.Exclude == "" && !r.said(row.Line, "scans") {
			r.add(row.Line, "scans", "the scans are missing; write the file, folder or pattern of the bottle's raw scans, relative to the root")
		}
		if row.Setup != "" {
			if _, ok := r.s.Setups[row.Setup]; !ok {
				r.add(row.Line, "setup", "%s", r.s.noSetup(row.Setup))
			}
		}
		r.blanks(row)
		r.links(row)
		r.concs(row)
	}
	r.circles()
}

// said reports whether a cell has its problem already, or the sheet has so many
// that one more helps nobody.
func (r *sheetReader) said(line int, col string) bool {
	return r.crowded() || slices.ContainsFunc(r.problems, func(p *Problem) bool { return p.Line == line && p.Column == col })
}

// blanks splits the cell of blanks into ids. An id may itself hold the marks that
// part them, so that the whole cell is tried first.
func (r *sheetReader) blanks(row *Row) {
	if len(row.Blanks) == 0 {
		return
	}
	text := row.Blanks[0]
	row.Blanks = nil
	ids := []string{text}
	if _, whole := r.ids[text]; !whole {
		mark := ";"
		if !strings.Contains(text, ";") {
			mark = ","
		}
		ids = strings.Split(text, mark)
	}
	for _, id := range ids {
		id = strings.TrimSpace(id)
		j, ok := r.ids[id]
		switch {
		case id == "":
		case !ok:
			r.add(row.Line, "blanks", "%s (separate ids by semicolons)", r.noRow(id, row.ID))
		case r.sheet.Rows[j].Kind != Blank:
			r.add(row.Line, "blanks", "%s is of kind %s; only a blank can be subtracted", quote(id), r.sheet.Rows[j].Kind)
		case slices.Contains(row.Blanks, id):
			r.add(row.Line, "blanks", "%s stands twice; remove one", quote(id))
		default:
			row.Blanks = append(row.Blanks, id)
		}
	}
}

// links checks the rows that a row names.
func (r *sheetReader) links(row *Row) {
	for _, l := range []struct{ col, id string }{{"replicate_of", row.ReplicateOf}, {"spike_of", row.SpikeOf}} {
		if l.id == "" {
			continue
		}
		if _, ok := r.ids[l.id]; !ok {
			r.add(row.Line, l.col, "%s", r.noRow(l.id, row.ID))
		} else if l.id == row.ID {
			r.add(row.Line, l.col, "the row names itself; write the id of the other bottle")
		}
	}
	switch {
	case row.Kind == Spike && row.SpikeOf == "":
		r.add(row.Line, "spike_of", "a spike needs the id of the bottle without the addition here")
	case row.Kind != Spike && row.Kind != "" && row.SpikeOf != "":
		r.add(row.Line, "spike_of", "the row's kind is %s; write kind spike, or empty this cell", row.Kind)
	}
}

// concs checks that concentrations stand where they are used.
func (r *sheetReader) concs(row *Row) {
	switch row.Kind {
	case Standard, Control, Spike:
		if len(row.Conc) == 0 && row.Exclude == "" && !r.saidConc(row.Line) {
			r.add(row.Line, "conc", "a %s needs a known concentration (%s); write it in a column conc:NAME [unit] with the component and its unit in the header, 0 where a component is absent", row.Kind, quote(row.ID))
		}
	default:
		if len(row.Conc) > 0 {
			r.note("sheet-conc", eem.Remark, row.Line, "%s is of kind %s, so that its known concentration of %s is not used", quote(row.ID), row.Kind, quote(row.Conc[0].Name))
		}
	}
}

// saidConc reports whether the concentrations of a row could not be read, or no
// number of the sheet could.
func (r *sheetReader) saidConc(line int) bool {
	return r.decimal == "" || r.crowded() || slices.ContainsFunc(r.problems, func(p *Problem) bool { return p.Line == line && isConc(p.Column) })
}

// crowded bounds the work that is done for problems which are not listed.
func (r *sheetReader) crowded() bool { return len(r.problems) > 50*maxProblems }

// circles reports rows that repeat each other in a circle.
func (r *sheetReader) circles() {
	seen := make([]int, len(r.sheet.Rows)) // the walk that came by, from 1
	for i := range r.sheet.Rows {
		j, ok := i, true
		for ok && seen[j] == 0 {
			seen[j] = i + 1
			row := &r.sheet.Rows[j]
			next, there := r.ids[row.ReplicateOf]
			ok = there && row.ReplicateOf != row.ID
			if ok && seen[next] == i+1 {
				r.add(row.Line, "replicate_of", "%s repeats %s, which in the end repeats %s; leave the cell of the first bottle empty", quote(row.ID), quote(row.ReplicateOf), quote(row.ID))
			}
			j = next
		}
	}
}

// exclude merges the rows of an exclusions file.
func (r *sheetReader) exclude(x *scanfile.Table) {
	at := map[string]int{"id": -1, "reason": -1}
	for i, h := range x.Header {
		if j, ok := at[strings.ToLower(strings.TrimSpace(h))]; ok && j < 0 {
			at[strings.ToLower(strings.TrimSpace(h))] = i
		}
	}
	if at["id"] < 0 || at["reason"] < 0 {
		r.problems.add(x.Path, x.HeadLine, "", "exclusions need the columns id and reason; the header has %s", quote(strings.Join(x.Header, ", ")))
		return
	}
	for i := range x.Rows {
		rec := &x.Rows[i]
		id, why := cell(rec, at["id"]), oneLine(cell(rec, at["reason"]))
		j, ok := r.ids[id]
		switch {
		case id == "":
			r.problems.add(x.Path, rec.Line, "id", "the id is missing; write the id of the row to exclude")
		case !ok:
			r.problems.add(x.Path, rec.Line, "id", "%s", r.noRow(id, ""))
		case why == "" || noReason(why):
			r.problems.add(x.Path, rec.Line, "reason", "%s is excluded without a reason; write why", quote(id))
		default:
			row := &r.sheet.Rows[j]
			if row.Exclude != "" && row.Exclude != why {
				why = row.Exclude + "; " + why
			}
			row.Exclude = why
		}
	}
}
