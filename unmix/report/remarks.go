package report

import (
	"slices"
	"strings"

	"tarnlight/eem"
)

// shared is a doubt that reaches more than one bottle; it is told once, and the
// bottles only point to it.
type shared struct {
	on, message string // on: "all bottles" or "batch NAME"
}

// indexShared gathers the doubts that have no bottle of their own.
func (r *results) indexShared() {
	t := r.table["flags.csv"]
	for i := range t.Rows {
		if t.Text(i, t.Col("id")) != "" || parseSeverity(t.Text(i, t.Col("severity"))) < eem.Doubt {
			continue
		}
		on := "all bottles"
		if b := t.Text(i, t.Col("batch")); b != "" {
			on = "batch " + b
		}
		_, accepted := r.s.Accepts[t.Text(i, t.Col("test"))]
		if s := (shared{on, t.Text(i, t.Col("message"))}); s.message != "" && !accepted && !slices.Contains(r.shared, s) {
			r.shared = append(r.shared, s)
		}
	}
}

// reasons splits the reasons of a contribution's qualifier into the bottle's own
// and those that more bottles share. A message may hold the "; " that stands
// between two of them: those that are known are taken out first.
func (r *results) reasons(x *bottle, c *contribution) (own []string, common []shared) {
	rest := c.reasons
	take := func(message string) bool {
		if message == "" || !strings.Contains(rest, message) {
			return false
		}
		rest = strings.ReplaceAll(rest, message, "")
		return true
	}
	for _, s := range r.shared {
		if take(s.message) {
			common = append(common, s)
		}
	}
	f := r.table["flags.csv"]
	for _, i := range x.flags {
		if m := f.Text(i, f.Col("message")); take(m) {
			own = append(own, r.told(i))
		}
	}
	return append(own, Leftover(rest)...), common
}

// told is finding i as a client reads it: what was found. The remedy behind it is for
// the laboratory and stands with the figures in the list of findings.
func (r *results) told(i int) string {
	f := r.table["flags.csv"]
	brief := eem.Brief(f.Text(i, f.Col("message")))
	if f.Text(i, f.Col("test")) == "unknown" { // the second half is what it does to the results
		return brief
	}
	first, _, _ := strings.Cut(brief, "; ")
	return first
}

// alsoOn begins the reason that stands for a doubt told of the bottle that its
// standards have too; their ids follow.
const alsoOn = "a doubt on this bottle is on its standards too: "

// Leftover parts reasons from which the messages told elsewhere were taken out. Of
// "standard ID: message" only the head is left then: one reason at the end names
// those standards.
func Leftover(reasons string) []string {
	var out, standards []string
	for _, s := range strings.Split(reasons, "; ") {
		s = strings.Trim(s, "; ")
		id, stump := strings.CutPrefix(strings.TrimSuffix(s, ":"), "standard ")
		switch {
		case s == "":
		case !stump || !strings.HasSuffix(s, ":"):
			out = append(out, s)
		case !slices.Contains(standards, id):
			standards = append(standards, id)
		}
	}
	if len(standards) > 0 {
		out = append(out, alsoOn+strings.Join(standards, ", "))
	}
	return out
}

// remarks are a bottle's doubts and the reasons of its qualifiers, in words. What
// it shares with others stands in the part of the report named by where.
func (r *results) remarks(x *bottle, where string) string {
	var out []string
	say := func(s string) {
		if s != "" && !strings.Contains(strings.Join(out, "; "), s) {
			out = append(out, s)
		}
	}
	say(x.excluded)
	f := r.table["flags.csv"]
	for _, i := range x.flags {
		if parseSeverity(f.Text(i, f.Col("severity"))) >= eem.Doubt {
			say(r.told(i))
		}
	}
	var on, standards []string
	for _, c := range r.series {
		k := x.of[c]
		if k == nil {
			continue
		}
		own, common := r.reasons(x, k)
		for _, reason := range own {
			if ids, ok := strings.CutPrefix(reason, alsoOn); ok {
				standards = append(standards, strings.Split(ids, ", ")...)
				continue
			}
			say(reason)
		}
		for _, s := range common {
			if !slices.Contains(on, s.on) {
				on = append(on, s.on)
			}
		}
	}
	if len(standards) > 0 {
		slices.Sort(standards)
		say(alsoOn + strings.Join(slices.Compact(standards), ", "))
	}
	for _, s := range on {
		say("see " + where + ", doubt on " + s)
	}
	return strings.Join(out, "; ")
}

// distinct are the reasons that one contribution does not share with all others
// that its method gives for the bottle.
func (r *results) distinct(x *bottle, of *column) []string {
	times, with := map[string]int{}, 0
	for _, s := range r.series {
		if k := x.of[s]; k != nil && s.method == of.method && k.qualifier != "" && k.qualifier != "U" {
			with++
			own, _ := r.reasons(x, k)
			for _, reason := range own {
				times[reason]++
			}
		}
	}
	own, _ := r.reasons(x, x.of[of])
	return slices.DeleteFunc(own, func(reason string) bool { return with > 1 && times[reason] >= with })
}
