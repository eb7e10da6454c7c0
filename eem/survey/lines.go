package survey

import (
	"slices"
	"strings"

	"github.com/pelletier/go-toml/v2/unstable"
)

// keyLines finds the line of every key and table of a valid TOML file, the first
// one where a table is opened more than once.
func keyLines(data []byte) map[string]int {
	var breaks []int
	for i, c := range data {
		if c == '\n' {
			breaks = append(breaks, i)
		}
	}
	lines := make(map[string]int)
	var p unstable.Parser
	mark := func(prefix []string, keys unstable.Iterator) []string {
		path := slices.Clone(prefix)
		for keys.Next() {
			n := keys.Node()
			path = append(path, string(n.Data))
			at, _ := slices.BinarySearch(breaks, int(n.Raw.Offset))
			if id := strings.Join(path, sep); lines[id] == 0 {
				lines[id] = at + 1
			}
		}
		return path
	}
	var walk func(prefix []string, n *unstable.Node)
	walk = func(prefix []string, n *unstable.Node) {
		path := mark(prefix, n.Key())
		if v := n.Value(); v.Kind == unstable.InlineTable {
			for it := v.Children(); it.Next(); {
				walk(path, it.Node())
			}
		}
	}
	var table []string
	for p.Reset(data); p.NextExpression(); {
		switch n := p.Expression(); n.Kind {
		case unstable.Table, unstable.ArrayTable:
			table = mark(nil, n.Key())
		case unstable.KeyValue:
			walk(table, n)
		}
	}
	return lines
}
