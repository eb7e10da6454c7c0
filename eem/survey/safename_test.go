package survey

import (
	"strings"
	"testing"
	"unicode/utf8"

	"pgregory.net/rapid"
)

func TestSafeName(t *testing.T) {
	for _, same := range []string{"S1", "2026-05-03 weir 2", "Müh.le", "水 1", "a+b,c;d(e)[f]{g}", "CONTROL", "COM10", "console", "a~b"} {
		if got := SafeName(same); got != same {
			t.Errorf("SafeName(%q) = %q; nothing needed changing", same, got)
		}
	}
	for id, begin := range map[string]string{
		`a/b`: "a_b~", `a\b`: "a_b~", `a:b`: "a_b~", "CON": "_CON~", "con.txt": "_con.txt~", "lpt¹": "_lpt¹~", "COM1 .x": "_COM1 .x~",
		"x.": "x~", "x ": "x~", ".hidden": "_hidden~", "..": "_~", "": "_~", "-rf": "_rf~", "~root": "_root~", "a\tb": "a_b~",
		"a\u202eb": "a_b~", "a\x00": "a_~", "a\xffb": "a_b~", "Mu\u0308h": "Müh~", "a_b~abcdefgh": "a_b~abcdefgh~",
		strings.Repeat("é", 300): strings.Repeat("é", 35) + "~",
	} {
		got := SafeName(id)
		if !strings.HasPrefix(got, begin) || len(got) != len(begin)+tagLen {
			t.Errorf("SafeName(%q) = %q, want %s and %d letters", id, got, begin, tagLen)
		}
		if again := SafeName(id); again != got {
			t.Errorf("SafeName(%q) = %q and %q", id, got, again)
		}
	}
	if a, b := SafeName("a/b"), SafeName("a:b"); a == b {
		t.Errorf("a/b and a:b are both %q", a)
	}
}

// TestSafeNameIsSafe: for any id at all the name is one that Windows, macOS and
// Linux take (the rules of Microsoft's "Naming Files, Paths, and Namespaces"), and
// different ids have different names.
func TestSafeNameIsSafe(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		ids := rapid.SliceOfN(rapid.OneOf(rapid.String(), rapid.StringMatching(`[ab/:~._ -]{0,6}`),
			rapid.SampledFrom([]string{"CON", "nul.x", "COM1", "é", "e\u0301", "\xff"})), 1, 30).Draw(t, "ids")
		n := NewNamer(ids)
		seen := make(map[string]string)
		for _, id := range ids {
			name := n.Name(id)
			if strings.ContainsAny(name, "/\\:*?\"<>|\x00") || strings.HasSuffix(name, ".") || strings.HasSuffix(name, " ") ||
				strings.HasPrefix(name, ".") || strings.HasPrefix(name, "-") || name == "" || len(name) > maxName ||
				isDevice(name) || !utf8.ValidString(name) || strings.ContainsFunc(name, isControl) {
				t.Fatalf("the name %q of %q is not safe", name, id)
			}
			if other, ok := seen[foldID(name)]; ok && other != id {
				t.Fatalf("%q and %q are both %q", id, other, name)
			}
			seen[foldID(name)] = id
		}
	})
}

func TestNamer(t *testing.T) {
	n := NewNamer([]string{"a", "A", "b/c", "b:c", "a"})
	if n.Name("a") != "a" || !strings.HasPrefix(n.Name("A"), "A~") {
		t.Errorf("a is %q, A is %q", n.Name("a"), n.Name("A"))
	}
	if n.Name("b/c") != SafeName("b/c") || n.Name("b:c") != SafeName("b:c") {
		t.Errorf("names that do not meet were changed: %q, %q", n.Name("b/c"), n.Name("b:c"))
	}
	defer func() {
		if recover() == nil {
			t.Error("an id without a name did not panic")
		}
	}()
	n.Name("c")
}
