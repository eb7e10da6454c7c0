package main

import (
	"fmt"
	"path"
	"slices"
	"strings"

	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
)

// idBook knows which ids are given.
type idBook struct {
	taken  map[string]*survey.Row          // by folded id
	places map[*survey.Row]map[string]bool // folders of a row's files
	byDay  map[string]string               // name and day → id of the first bottle
}

func (b *beginning) newIDBook(sheet *survey.Sheet, claims prepare.Claimed) *idBook {
	k := &idBook{map[string]*survey.Row{}, map[*survey.Row]map[string]bool{}, map[string]string{}}
	for i := range sheet.Rows {
		k.taken[survey.FoldID(sheet.Rows[i].ID)] = &sheet.Rows[i]
	}
	for file, rows := range claims {
		for _, row := range rows {
			if k.places[row] == nil {
				k.places[row] = map[string]bool{}
			}
			k.places[row][path.Dir(b.rel(file))] = true
		}
	}
	return k
}

// distinct gives every bottle an id that neither the sheet nor another bottle has:
// the name, with its number or word for a repetition; where that is taken by a
// bottle of another day or folder, with day or folder behind it. One that cannot have
// the id of its name is set aside.
func (b *beginning) distinct(list []*drafted, sheet *survey.Sheet, claims prepare.Claimed) []*drafted {
	k := b.newIDBook(sheet, claims)
	var out []*drafted
	for _, d := range list {
		base := d.id
		switch {
		case d.n > 1:
			d.id = fmt.Sprintf("%s-%d", base, d.n)
		case d.repeats:
			d.id = base + "-dup"
		}
		if d.broken != "" && k.taken[survey.FoldID(d.id)] != nil {
			b.leaveOpen(d.name(), "%s; there is a bottle of its name (%s) already; export it again, remove it, or name it as ignore under [sheet] in survey.toml", d.broken, d.id)
			continue
		}
		if id := k.idOf(d); d.aside != "" {
			d.id = k.unused(d.id)
		} else {
			d.id = id
			k.findFirst(d, base)
		}
		if d.broken != "" {
			b.leaveOpen(d.name(), "%s; its row is there, and it is read once it is whole", d.broken)
		}
		k.taken[survey.FoldID(d.id)] = &survey.Row{ID: d.id}
		out = append(out, d)
	}
	return out
}

// idOf finds the id of a bottle, or says why it is set aside.
func (k *idBook) idOf(d *drafted) string {
	id, late := k.free(d)
	switch {
	case d.aside != "":
	case late != nil:
		d.aside = fmt.Sprintf("by its name it belongs to %s, whose row (line %d) does not name it", late.ID, late.Line)
	case d.calls != "" && d.calls != id:
		d.aside = d.namesake()
	}
	return id
}

// findFirst finds the sample of one day that a bottle repeats: by its number, its
// word, or as the same water at another dilution.
func (k *idBook) findFirst(d *drafted, base string) {
	of := base + "\x00" + d.day
	first, again := k.byDay[of]
	switch {
	case d.kind != survey.Sample:
	case again && (d.n > 1 || d.repeats || d.dilution > 0):
		d.replicateOf = first
	case d.n > 1 || d.repeats:
		if row := k.taken[survey.FoldID(base)]; row != nil && (d.day == "" || row.Measured.Day() == "" || row.Measured.Day() == d.day) {
			d.replicateOf = row.ID
		}
	default:
		k.byDay[of] = d.id
	}
}

// free finds an id that is not taken, or the row of the same bottle.
func (k *idBook) free(d *drafted) (id string, late *survey.Row) {
	tries := []string{d.id}
	if d.day != "" {
		tries = append(tries, d.id+" "+d.day)
	}
	if d.dir != "." {
		tries = append(tries, d.id+" "+path.Base(d.dir), d.id+" "+strings.ReplaceAll(d.dir, "/", "-"))
	}
	for _, id := range tries {
		row := k.taken[survey.FoldID(id)]
		if row == nil {
			return id, nil
		}
		if k.places[row][d.dir] && (d.day == "" || row.Measured.Day() == "" || row.Measured.Day() == d.day) {
			return "", row
		}
	}
	for n := 2; ; n++ {
		if id := fmt.Sprintf("%s (%d)", d.id, n); k.taken[survey.FoldID(id)] == nil {
			return id, nil
		}
	}
}

// unused gives an id that no row has.
func (k *idBook) unused(id string) string {
	for n := 1; ; n++ {
		try := id
		if n > 1 {
			try = fmt.Sprintf("%s (%d)", id, n)
		}
		if k.taken[survey.FoldID(try)] == nil {
			return try
		}
	}
}

// byPath gives bottles of one name in different folders the folder's too, and names
// repetitions.
func byPath(list []*drafted) []*drafted {
	count := map[string]int{}
	for _, d := range list {
		if d.repeats {
			d.id += "-dup"
		}
		count[survey.FoldID(d.id)]++
	}
	for _, d := range list {
		if count[survey.FoldID(d.id)] > 1 || d.id == "" {
			d.id = strings.NewReplacer("/", "-", "*", "").Replace(strings.TrimSuffix(d.scans, endingOf(d.scans)))
		}
		d.id = strings.TrimLeft(d.id, formulaMarks)
	}
	taken := map[string]int{}
	for _, d := range list {
		l := survey.FoldID(d.id)
		if taken[l]++; taken[l] > 1 || l == "" {
			d.id = fmt.Sprintf("%s (%d)", d.id, taken[l])
		}
	}
	for _, d := range list {
		for _, x := range list {
			if d.repeats && d.kind == survey.Sample && !x.repeats && x.first == d.first && x.dir == d.dir {
				d.replicateOf = x.id
			}
		}
	}
	slices.SortFunc(list, func(a, b *drafted) int { return strings.Compare(a.id, b.id) })
	return list
}
