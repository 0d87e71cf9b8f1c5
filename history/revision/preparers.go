package revision

import (
	"slices"
	"strings"
)

// Preparer is somebody who had a part in a commit.
type Preparer struct {
	Name  string
	Email string // ASCII letters in lower case
}

// Preparers gives everybody who wrote or committed one of the commits or stands
// in a Co-authored-by line of its message, each once, sorted by address and name.
// Addresses are the same person when they differ in ASCII letter case alone; of
// several names for one address the first in byte order is kept. Without an
// address the name tells people apart.
//
// A Co-authored-by line counts wherever it stands in the message, not only in
// its last paragraph: who prepared a change must not hide behind an empty line.
func (r *Repo) Preparers(commits []Commit) []Preparer {
	var all []Preparer
	add := func(p Person) {
		if p.Name != "" || p.Email != "" {
			all = append(all, Preparer{p.Name, lowerASCII(p.Email)})
		}
	}
	for _, c := range commits {
		add(c.Author)
		add(c.Committer)
		for line := range strings.Lines(c.Message) {
			key, value, ok := strings.Cut(line, ":")
			if ok && lowerASCII(strings.TrimSpace(key)) == "co-authored-by" {
				add(parsePerson([]byte(strings.TrimSpace(value)), false))
			}
		}
	}
	slices.SortFunc(all, func(a, b Preparer) int {
		if c := strings.Compare(a.Email, b.Email); c != 0 {
			return c
		}
		return strings.Compare(a.Name, b.Name)
	})
	return slices.CompactFunc(all, func(a, b Preparer) bool {
		return a.Email == b.Email && (a.Email != "" || a.Name == b.Name)
	})
}

func lowerASCII(s string) string {
	b := []byte(s)
	for i, c := range b {
		if 'A' <= c && c <= 'Z' {
			b[i] = c + 'a' - 'A'
		}
	}
	return string(b)
}
