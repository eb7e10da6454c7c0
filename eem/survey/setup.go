package survey

import (
	"errors"
	"fmt"
	"maps"
	"slices"
	"strings"

	toml "github.com/pelletier/go-toml/v2"
)

// For returns the settings of the rows whose setup has this name: s itself with
// the overrides of [setup.NAME] in the tables scans, correct, intensity and
// scatter. The empty name gives s unchanged. Maps and slices are shared with s.
func (s *Settings) For(setup string) (*Settings, error) {
	if setup == "" {
		return s, nil
	}
	u, ok := s.Setups[setup]
	if !ok {
		return nil, errors.New(s.noSetup(setup))
	}
	out := *s
	for _, o := range u.Set {
		k, ok := byName()[o.Key]
		if !ok || !slices.Contains(setupTables, k.table) {
			return nil, fmt.Errorf("setup %q: %s is no key that a setup can override", setup, quote(o.Key))
		}
		v, err := o.decode()
		if err == nil {
			err = k.set(&out, v)
		}
		if err != nil {
			return nil, fmt.Errorf("setup %q: %s: %w", setup, o.Key, err)
		}
	}
	return &out, nil
}

// decode parses the override's value.
func (o Override) decode() (any, error) {
	var m map[string]any
	if err := toml.Unmarshal([]byte("v = "+o.Value), &m); err != nil || len(m) != 1 {
		return nil, fmt.Errorf("%s is no TOML value", quote(o.Value))
	}
	return m["v"], nil
}

// noSetup says that a setup is not in the settings, and which ones are.
func (s *Settings) noSetup(name string) string {
	names := slices.Sorted(maps.Keys(s.Setups))
	msg := "the settings have no table [setup." + tomlKey(name) + "]"
	if near, ok := nearest(name, names); ok {
		return msg + "; did you mean " + quote(near) + "?"
	}
	if len(names) == 0 {
		return msg + "; add it to survey.toml or leave the column empty"
	}
	return msg + "; the ones there are " + strings.Join(names, ", ")
}

// setups reads every [setup.NAME].
func (r *settingsReader) setups(m map[string]any) {
	for _, name := range r.inOrder([]string{"setup"}, m) {
		p := []string{"setup", name}
		sub, ok := m[name].(map[string]any)
		switch {
		case r.full():
			return
		case !ok:
			r.add(p, "a setup needs a name: write [setup.NAME] on a line of its own and its keys below")
		case strings.TrimSpace(name) != name || name == "" || strings.ContainsFunc(name, isControl):
			r.add(p, "a setup's name may not be empty, begin or end with a blank, or hold control characters")
		default:
			r.setup(p, sub)
		}
	}
}

// setup reads one [setup.NAME]: its own keys, and keys of the tables that it
// overrides, written scans.form, as [setup.NAME.scans] form, or just form (no
// name stands in two of the tables).
func (r *settingsReader) setup(p []string, m map[string]any) {
	u := &Setup{}
	set := make(map[string]string) // TOML value by dotted key
	before := len(r.problems)
	r.setupTable(p, nil, m, u, set)
	for _, k := range schema() {
		if v, ok := set[k.full()]; ok {
			u.Set = append(u.Set, Override{Key: k.full(), Value: v})
		}
	}
	if r.s.Setups == nil {
		r.s.Setups = make(map[string]*Setup)
	}
	r.s.Setups[p[1]] = u
	if len(r.problems) > before {
		return
	}
	if merged, err := r.s.For(p[1]); err != nil {
		r.add(p, "%v", err)
	} else {
		r.agree(merged, p)
	}
}

// setupTable reads the keys of a setup below rel, a path inside the setup.
func (r *settingsReader) setupTable(setup, rel []string, m map[string]any, u *Setup, set map[string]string) {
	base := slices.Concat(setup, rel)
	for _, name := range r.inOrder(base, m) {
		if r.full() {
			return
		}
		p, v := append(slices.Clone(base), name), m[name]
		sub, isTable := v.(map[string]any)
		k := overridden(append(slices.Clone(rel), name))
		switch {
		case strings.Contains(name, "."):
			r.unknownAmong(p, setupNames(), nil)
		case k != nil:
			r.override(p, k, v, set)
		case len(rel) == 0 && r.ownKey(p, name, v, u):
		case isTable && leadsToKey(append(slices.Clone(rel), name)):
			r.setupTable(setup, append(slices.Clone(rel), name), sub, u, set)
		default:
			r.unknownSetup(p, rel)
		}
	}
}

// override checks one overridden value and keeps it as TOML.
func (r *settingsReader) override(p []string, k *key, v any, set map[string]string) {
	scratch := Default()
	if err := k.set(scratch, v); err != nil {
		r.add(p, "%v", err)
		return
	}
	if _, twice := set[k.full()]; twice {
		r.add(p, "%s stands twice in this setup; remove one", k.full())
		return
	}
	set[k.full()] = k.codec.write(k.field(scratch))
}

// ownKey reads one of the setup's own keys and says whether it is one.
func (r *settingsReader) ownKey(p []string, name string, v any, u *Setup) bool {
	for _, k := range setupKeys() {
		if k.name != name {
			continue
		}
		if err := k.codec.read(k.field(u), v); err != nil {
			r.add(p, "%s is not allowed; write %s", showValue(v), k.codec.what)
		}
		return true
	}
	return false
}

// overridden finds the key that a path inside a setup names, with or without its
// table.
func overridden(rel []string) *key {
	name := strings.Join(rel, ".")
	for _, k := range schema() {
		if slices.Contains(setupTables, k.table) && (k.full() == name || k.name == name) {
			return k
		}
	}
	return nil
}

// leadsToKey says whether a path inside a setup is a table that holds keys.
func leadsToKey(rel []string) bool {
	prefix := strings.Join(rel, ".") + "."
	for _, k := range schema() {
		if slices.Contains(setupTables, k.table) && (strings.HasPrefix(k.full(), prefix) || strings.HasPrefix(k.name, prefix)) {
			return true
		}
	}
	return false
}

// setupNames lists what may stand at the top of a setup.
func setupNames() []string {
	var names []string
	for _, k := range setupKeys() {
		names = append(names, k.name)
	}
	names = append(names, setupTables...)
	for _, k := range schema() {
		if slices.Contains(setupTables, k.table) {
			names = append(names, k.name)
		}
	}
	return names
}

// unknownSetup reports a key that a setup does not have.
func (r *settingsReader) unknownSetup(p, rel []string) {
	name := p[len(p)-1]
	here := setupNames()
	if len(rel) > 0 {
		here = nil
		prefix := strings.Join(rel, ".") + "."
		for _, k := range schema() {
			if rest, ok := strings.CutPrefix(k.full(), prefix); ok {
				here = append(here, rest)
			} else if rest, ok := strings.CutPrefix(k.name, prefix); ok && slices.Contains(setupTables, k.table) {
				here = append(here, rest)
			}
		}
	}
	for _, k := range schema() {
		if (k.name == name || k.table == name) && !slices.Contains(setupTables, k.table) {
			r.add(p, "a setup cannot override this; it holds for the whole survey, under [%s]", k.table)
			return
		}
	}
	if _, ok := nearest(name, here); !ok && len(rel) == 0 { // the list would be too long
		r.add(p, "there is no such key; a setup has instrument, bandpass, integration and any key of %s", strings.Join(setupTables, ", "))
		return
	}
	r.unknownAmong(p, here, nil)
}
