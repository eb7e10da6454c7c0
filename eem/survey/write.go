package survey

import (
	"bytes"
	"io"
	"maps"
	"slices"
)

// WriteTo writes every setting with the value in force, in the order of Keys.
// ReadSettings gives equal Settings back.
func (s *Settings) WriteTo(w io.Writer) (int64, error) {
	var b bytes.Buffer
	table := ""
	for _, k := range schema() {
		if k.table != table {
			table = k.table
			b.WriteString("\n[" + table + "]\n")
		}
		b.WriteString(k.name + " = " + k.codec.write(k.field(s)) + "\n")
	}
	for _, name := range slices.Sorted(maps.Keys(s.Setups)) {
		u := s.Setups[name]
		b.WriteString("\n[setup." + tomlKey(name) + "]\n")
		for _, k := range setupKeys() {
			b.WriteString(k.name + " = " + tomlText(*k.field(u)) + "\n")
		}
		for _, o := range u.Set {
			b.WriteString(o.Key + " = " + o.Value + "\n")
		}
	}
	return b.WriteTo(w)
}
