package survey

import (
	"crypto/sha256"
	"encoding/base32"
	"strings"
	"unicode"
	"unicode/utf8"

	"golang.org/x/text/unicode/norm"
)

// maxName is the longest safe name, bytes: room for a suffix within the 255 bytes
// of common file systems, and within the 143 of encrypted ones.
const maxName = 80

// tagLen is how many letters mark a name that is not the id itself. They stand
// for 40 bits: among 10,000 changed ids two agree with a chance of 5e-5.
const tagLen = 8

// SafeName maps an id to a file name that every common system takes, without its
// extension. An id that is such a name stays as it is. Any other is changed
// (separators, wildcards, control and formatting characters become "_", device
// names of Windows and too long ones are cut) and gets "~" and eight letters that
// depend on the whole id, so that different ids have different names without
// looking at each other. The empty id gives a name too.
func SafeName(id string) string {
	if cleanName(id) == id && !tagged(id) {
		return id
	}
	return changedName(id, tagLen)
}

// changedName is the clean name of an id and n letters of its tag.
func changedName(id string, n int) string {
	return cutBytes(cleanName(id), maxName-n-1) + "~" + tag(id)[:n]
}

// cleanName replaces what a file name may not hold.
func cleanName(id string) string {
	s := norm.NFC.String(strings.ToValidUTF8(id, "_"))
	s = strings.Map(func(r rune) rune {
		switch {
		case strings.ContainsRune(`/\:*?"<>|`, r), r == utf8.RuneError, r != ' ' && unicode.IsSpace(r),
			unicode.In(r, unicode.Cc, unicode.Cf, unicode.Co, unicode.Cs):
			return '_'
		}
		return r
	}, s)
	if t := strings.TrimLeft(s, " .-~"); t != s { // hidden, an option, a home folder
		s = "_" + t
	}
	s = strings.TrimRight(s, " .")
	if s == "" || isDevice(s) {
		s = "_" + s
	}
	return cutBytes(s, maxName)
}

// isDevice says whether Windows takes the name, with any extension, for a device.
func isDevice(name string) bool {
	stem, _, _ := strings.Cut(strings.ToUpper(name), ".")
	stem = strings.TrimRight(stem, " ")
	switch stem {
	case "CON", "PRN", "AUX", "NUL", "CONIN$", "CONOUT$", "CLOCK$":
		return true
	}
	port, ok := strings.CutPrefix(stem, "COM")
	if !ok {
		port, ok = strings.CutPrefix(stem, "LPT")
	}
	return ok && utf8.RuneCountInString(port) == 1 && strings.ContainsAny(port, "0123456789¹²³")
}

// tagged says whether an id looks like a changed name, which must not stay, lest
// it meet the changed name of another id.
func tagged(id string) bool {
	i := strings.LastIndexByte(id, '~')
	return i >= 0 && len(id)-i-1 >= tagLen
}

// tag gives 52 letters and digits that depend on the whole id.
func tag(id string) string {
	h := sha256.Sum256([]byte(id))
	return strings.ToLower(base32.StdEncoding.WithPadding(base32.NoPadding).EncodeToString(h[:]))
}

// cutBytes cuts s to at most n bytes, between characters.
func cutBytes(s string, n int) string {
	if len(s) <= n {
		return s
	}
	for n > 0 && !utf8.RuneStart(s[n]) {
		n--
	}
	return s[:n]
}

// Namer gives every one of a set of ids its safe name, and makes sure that no two
// are equal where case is ignored. Ids of one run sheet never need that; ids from
// elsewhere may.
type Namer struct {
	names map[string]string
}

// NewNamer names ids, in their order: the first of two ids whose safe names would
// meet keeps it.
func NewNamer(ids []string) *Namer {
	n := &Namer{names: make(map[string]string, len(ids))}
	taken := make(map[string]bool, len(ids))
	for _, id := range ids {
		if _, done := n.names[id]; done {
			continue
		}
		name := SafeName(id)
		if taken[foldID(name)] {
			name = changedName(id, 2*tagLen)
		}
		taken[foldID(name)] = true
		n.names[id] = name
	}
	return n
}

// Name returns the name of an id. It panics when the id was not given to NewNamer.
func (n *Namer) Name(id string) string {
	name, ok := n.names[id]
	if !ok {
		panic("survey: an id without a name: " + quote(id))
	}
	return name
}
