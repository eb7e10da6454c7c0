package main

import (
	"cmp"
	"errors"
	"math"
	"slices"
	"strconv"
	"strings"

	"tarnlight/eem"
	"tarnlight/unmix/plan"
)

// wishes brings what the flags say of components, interferents and wavelengths.
func (in *planInput) wishes(o planOptions) error {
	p, names := &in.problem, in.problem.Set.Names()
	levels, err := amounts("--level", o.levels, names)
	if err != nil {
		return err
	}
	p.Want = make([]bool, len(names))
	if in.levels == "" {
		in.levels = "one of intensity at each maximum"
		if len(levels) < len(names) {
			in.note("nobody said what a typical bottle holds: each component is taken to reach an intensity of 1 at its maximum (--level NAME=AMOUNT)")
		}
	}
	for f, n := range names {
		if v, ok := levels[n]; ok {
			p.Level[f] = v
		}
		p.Want[f] = !slices.Contains(o.apart, n)
	}
	for _, n := range o.apart {
		if err := known("--apart", n, names); err != nil {
			return err
		}
	}
	if !slices.Contains(p.Want, true) {
		return misuse("--apart names all components; leave out those whose value is asked for")
	}
	if p.Unknown, err = unknownBands(o.unknown); err != nil {
		return err
	}
	p.WorstCase = o.worst
	if err := in.excitations(o.excitation); err != nil {
		return err
	}
	return in.window(o.emission)
}

// excitations leaves out those that lie outside the range wanted.
func (in *planInput) excitations(text string) error {
	if text == "" {
		return nil
	}
	from, to, _, err := span("--excitation", text, false)
	if err != nil {
		return err
	}
	g := in.problem.Set.Grid
	in.leaveOut(func(i int, _ eem.Reason) bool {
		nm := g.Ex.At(i / g.Em.Len())
		return nm < from || nm > to
	}, nil)
	return nil
}

func unknownBands(given []string) ([]plan.Emission, error) {
	var out []plan.Emission
	for _, g := range given {
		at, width, has := strings.Cut(g, ":")
		e := plan.Emission{WidthNM: 80}
		var err1, err2 error
		e.AtNM, err1 = strconv.ParseFloat(at, 64)
		if has {
			e.WidthNM, err2 = strconv.ParseFloat(width, 64)
		}
		if errors.Join(err1, err2) != nil || !(e.AtNM > 0 && e.WidthNM > 0) {
			return nil, misuse("--unknown %q; write EMISSION or EMISSION:WIDTH in nm, such as 490:80", g)
		}
		out = append(out, e)
	}
	return out, nil
}

// window reads the emission range; a step is the nearest multiple of the grid's.
func (in *planInput) window(text string) error {
	if text == "" {
		return nil
	}
	from, to, step, err := span("--emission", text, true)
	if err != nil {
		return err
	}
	em := in.problem.Set.Grid.Em
	w := plan.Window{From: -1, Stride: 1}
	for k := range em.Len() {
		if nm := em.At(k); nm >= from && nm <= to {
			if w.From < 0 {
				w.From = k
			}
			w.To = k + 1
		}
	}
	if w.From < 0 || w.To-w.From < 2 {
		return misuse("--emission %s: the references know emissions of %s", text, em)
	}
	if step > 0 {
		of := (em.At(w.To-1) - em.At(w.From)) / float64(w.To-1-w.From)
		w.Stride = max(1, int(math.Round(step/of)))
		if got := float64(w.Stride) * of; math.Abs(got-step) > 0.01*step {
			in.note("--emission: a step of %g nm on points that are %.4g nm apart becomes %.4g nm", step, of, got)
		}
	}
	in.problem.Window = w
	return nil
}

// linesAt finds excitations of the grid.
func linesAt(ax eem.Axis, nm []float64, usable []int) ([]int, error) {
	var out []int
	for _, v := range nm {
		j, ok := ax.Find(v)
		if !ok || !slices.Contains(usable, j) {
			return nil, misuse("--with %g: no excitation of the references that can be used; the nearest is %g nm", v, ax.At(nearestOf(ax, usable, v)))
		}
		if !slices.Contains(out, j) {
			out = append(out, j)
		}
	}
	return out, nil
}

func nearestOf(ax eem.Axis, lines []int, nm float64) int {
	return slices.MinFunc(lines, func(a, b int) int {
		return cmp.Compare(math.Abs(ax.At(a)-nm), math.Abs(ax.At(b)-nm))
	})
}

// amounts reads NAME=AMOUNT, several times.
func amounts(flag string, given, names []string) (map[string]float64, error) {
	out := map[string]float64{}
	for _, g := range given {
		name, value, ok := cutLast(g, "=")
		v, err := strconv.ParseFloat(strings.TrimSpace(value), 64)
		if !ok || err != nil || !(v > 0) || v > 1e300 {
			return nil, misuse("%s %q; write NAME=AMOUNT with an amount above 0", flag, g)
		}
		if err := known(flag, name, names); err != nil {
			return nil, err
		}
		out[name] = v
	}
	return out, nil
}

// cutLast cuts at the last separator: names may hold one.
func cutLast(s, sep string) (before, after string, ok bool) {
	i := strings.LastIndex(s, sep)
	if i < 0 {
		return s, "", false
	}
	return s[:i], s[i+len(sep):], true
}

func known(flag, name string, names []string) error {
	if slices.Contains(names, name) {
		return nil
	}
	return misuse("%s: there is no component %q; %s", flag, name, meant(name, names))
}

// span reads FROM:TO[:STEP]; step is 0 where it is not given or not allowed.
func span(flag, text string, withStep bool) (from, to, step float64, err error) {
	parts := strings.Split(text, ":")
	v := make([]float64, 3)
	bad := len(parts) < 2 || len(parts) > 3 || len(parts) == 3 && !withStep
	for i, p := range parts {
		if bad {
			break
		}
		x, perr := strconv.ParseFloat(strings.TrimSpace(p), 64)
		bad = perr != nil || !(x > 0)
		v[i] = x
	}
	if bad || !(v[1] > v[0]) {
		form := "FROM:TO"
		if withStep {
			form = "FROM:TO[:STEP]"
		}
		return 0, 0, 0, misuse("%s %q; write %s in nm, such as 300:550", flag, text, form)
	}
	return v[0], v[1], v[2], nil
}
