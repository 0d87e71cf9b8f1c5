package revision

import (
	"fmt"
	"regexp"
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
// address the name tells people apart; who has neither is somebody all the same.
//
// A Co-authored-by line counts wherever it stands in the message, not only in
// its last paragraph: who prepared a change must not hide behind an empty line. It
// goes on in the lines below that begin with a blank, as git folds it, and every
// address in it counts. A commit in an encoding that is not read here can name
// people to git whom nobody sees here: it has a preparer without an address.
func (r *Repo) Preparers(commits []Commit) []Preparer {
	var all []Preparer
	add := func(p Person) { all = append(all, Preparer{p.Name, lowerASCII(p.Email)}) }
	for _, c := range commits {
		add(c.Author)
		add(c.Committer)
		for _, p := range c.Further {
			add(p)
		}
		for _, value := range coAuthors(c.Message) {
			for _, p := range peopleIn(value) {
				add(p)
			}
		}
		if !readable(c.Encoding) {
			add(Person{Name: fmt.Sprintf("whoever commit %s names in the encoding %+.40q", c.Hash, c.Encoding)})
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

// coAuthors gives the values of the Co-authored-by lines, each on one line. A line
// that begins with a blank and is one itself does not go on with the one above.
func coAuthors(message string) []string {
	var values []string
	open := false // the line above is one, or goes on with one
	for line := range strings.Lines(message) {
		key, value, ok := strings.Cut(line, ":")
		switch rest := strings.Trim(line, gitBlanks); {
		case ok && lowerASCII(strings.TrimSpace(key)) == "co-authored-by":
			values = append(values, strings.TrimSpace(value))
			open = true
		case open && rest != "" && strings.IndexByte(gitBlanks, line[0]) >= 0:
			values[len(values)-1] += " " + rest
		default:
			open = false
		}
	}
	return values
}

// gitBlanks are the characters that git takes for blanks.
const gitBlanks = " \t\r\n"

// peopleIn gives the people of a list such as "A <a@x>, B <b@x>"; one without an
// address where there are no brackets; nobody where there is nothing.
func peopleIn(list string) []Person {
	var people []Person
	for list = strings.TrimSpace(list); list != ""; {
		end := strings.IndexByte(list, '>') + 1
		if end == 0 || !strings.Contains(list[:end], "<") {
			end = len(list)
		}
		if one := list[:end]; len(people) == 0 || strings.Contains(one, "<") {
			people = append(people, parsePerson([]byte(one), false))
		}
		list = strings.TrimLeft(list[end:], " \t,;&")
	}
	return people
}

// readable tells whether text in an encoding can be searched for the names of
// keys and addresses: ASCII is ASCII there, and nothing else is. A git that knows
// more encodings reads a key there that has other bytes here.
func readable(encoding string) bool {
	return encoding == "" || readableEncodings.MatchString(encoding)
}

var readableEncodings = regexp.MustCompile(`(?i)^(utf-?8|(us-)?ascii|iso[-_]?8859-\d\d?|latin-?\d\d?|(windows-|cp)125\d|koi8-[ru]|euc-(jp|kr|cn|tw)|gbk|gb2312|gb18030|big5|cp9(32|36|49|50))$`)

func lowerASCII(s string) string {
	b := []byte(s)
	for i, c := range b {
		if 'A' <= c && c <= 'Z' {
			b[i] = c + 'a' - 'A'
		}
	}
	return string(b)
}
