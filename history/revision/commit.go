package revision

import (
	"bytes"
	"errors"
	"fmt"
	"strconv"
	"strings"
	"time"
	"unicode/utf8"

	"github.com/go-git/go-git/v5/plumbing"
)

const (
	maxCommit  = 16 << 20 // bytes of one commit or tag object
	maxParents = 4096     // parents of one commit
)

// Person is who wrote or committed, and when. Name and address are as recorded;
// a mailmap is not applied.
type Person struct {
	Name  string
	Email string
	When  time.Time // in the recorded offset from UTC; zero where none can be read
}

// Commit is one commit of a repository. Texts are valid UTF-8: bytes that are
// not are read as ISO 8859-1 where the commit says so, and otherwise replaced
// with U+FFFD.
type Commit struct {
	Hash      string   // 40 hexadecimal digits
	Tree      string   // 40 hexadecimal digits
	Parents   []string // as recorded, also where a shallow clone lacks them
	Author    Person
	Committer Person
	Subject   string // first paragraph of the message on one line
	Message   string // whole message, the subject included

	// Further holds the authors and committers of lines that a commit may not have
	// twice, and that damaged ones do.
	Further []Person
	// Encoding is the one that the commit says it is in; empty where it says none.
	Encoding string

	// Boundary says that a shallow clone ends here: the commit may record
	// parents, but they are not part of this clone's history.
	Boundary bool
}

// links is what a walk needs of a commit.
type links struct {
	tree     plumbing.Hash
	parents  []plumbing.Hash
	when     int64 // seconds since 1970 of the committer
	boundary bool  // history was cut here
}

// parseCommit reads the bytes of a commit object. Tree and parents must be
// there and well formed, as everything rests on them; persons and the message
// are read leniently.
func parseCommit(data []byte) (Commit, error) {
	var c Commit
	line, rest := cutLine(data)
	hash, err := headerHash(line, "tree ")
	if err != nil {
		return Commit{}, err
	}
	c.Tree = hash.String()
	parents, rest, err := headerParents(rest)
	if err != nil {
		return Commit{}, err
	}
	for _, hash := range parents {
		c.Parents = append(c.Parents, hash.String())
	}
	author, committer, rest, err := headerPeople(rest)
	if err != nil {
		return Commit{}, err
	}
	latin, said := false, false
	var further [][]byte
	for len(rest) > 0 && rest[0] != '\n' {
		line, rest = cutLine(rest)
		if name, ok := bytes.CutPrefix(line, []byte("encoding ")); ok && !said {
			said = true // git goes by the first line, too
			latin, c.Encoding = isLatin1(string(name)), decodeText(name, false)
		}
		for _, key := range [...]string{"author ", "committer "} {
			if text, ok := bytes.CutPrefix(line, []byte(key)); ok {
				further = append(further, text)
			}
		}
	}
	for _, text := range further {
		c.Further = append(c.Further, parsePerson(text, latin))
	}
	c.Author, c.Committer = parsePerson(author, latin), parsePerson(committer, latin)
	if len(rest) > 0 {
		c.Message = decodeText(rest[1:], latin)
	}
	c.Subject = subject(c.Message)
	return c, nil
}

// timeOf gives what stands behind the address in "Name <address> seconds +hhmm",
// cut at ASCII blanks. It looks at bytes, so that the encoding of the commit says
// nothing of its time; none where there is no address.
func timeOf(person []byte) []string {
	open, end := bytes.IndexByte(person, '<'), bytes.LastIndexByte(person, '>')
	if open < 0 || end < open {
		return nil
	}
	return strings.FieldsFunc(string(person[end+1:]), func(r rune) bool { return r == ' ' || '\t' <= r && r <= '\r' })
}

func parseSeconds(text string) (int64, bool) {
	seconds, err := strconv.ParseInt(text, 10, 64)
	if err != nil || seconds < 0 || seconds > maxSeconds {
		return 0, false
	}
	return seconds, true
}

// parseLinks reads of a commit object only what a walk needs.
func parseLinks(data []byte) (links, error) {
	var l links
	line, rest := cutLine(data)
	tree, err := headerHash(line, "tree ")
	if err != nil {
		return links{}, err
	}
	l.tree = tree
	if l.parents, rest, err = headerParents(rest); err != nil {
		return links{}, err
	}
	_, committer, _, err := headerPeople(rest)
	if err != nil {
		return links{}, err
	}
	if fields := timeOf(committer); len(fields) > 0 {
		l.when, _ = parseSeconds(fields[0])
	}
	return l, nil
}

// parseTag reads of a tag object what it points to.
func parseTag(data []byte) (plumbing.Hash, error) {
	line, rest := cutLine(data)
	hash, err := headerHash(line, "object ")
	if err != nil {
		return hash, err
	}
	if line, _ := cutLine(rest); !bytes.HasPrefix(line, []byte("type ")) {
		return hash, errors.New(`the second line does not begin with "type "`)
	}
	return hash, nil
}

func cutLine(data []byte) (line, rest []byte) {
	line, rest, _ = bytes.Cut(data, []byte("\n"))
	return line, rest
}

func headerHash(line []byte, key string) (plumbing.Hash, error) {
	text, ok := bytes.CutPrefix(line, []byte(key))
	if !ok {
		return plumbing.ZeroHash, fmt.Errorf("a line that begins with %q is missing", key)
	}
	hash, ok := parseHash(string(text))
	if !ok {
		return plumbing.ZeroHash, fmt.Errorf("%q is not followed by a hash", key)
	}
	return hash, nil
}

// headerParents takes the lines of the parents, which stand below the tree.
func headerParents(data []byte) (parents []plumbing.Hash, rest []byte, err error) {
	for rest = data; ; {
		line, next := cutLine(rest)
		if !bytes.HasPrefix(line, []byte("parent ")) {
			return parents, rest, nil
		}
		hash, err := headerHash(line, "parent ")
		if err != nil {
			return nil, nil, err
		}
		if len(parents) == maxParents {
			return nil, nil, fmt.Errorf("more than %d parents", maxParents)
		}
		parents, rest = append(parents, hash), next
	}
}

// headerPeople takes the lines of author and committer, where they stand. Git does
// without them, and one commit that somebody wrote by hand may not take the history
// from everybody: those who made it are people without a name.
func headerPeople(data []byte) (author, committer, rest []byte, err error) {
	rest = data
	for _, x := range []struct {
		key string
		to  *[]byte
	}{{"author ", &author}, {"committer ", &committer}} {
		line, after := cutLine(rest)
		if text, ok := bytes.CutPrefix(line, []byte(x.key)); ok {
			*x.to, rest = text, after
		}
	}
	// A parent that stands elsewhere is none to git: what came before it would be out
	// of sight.
	if headers, _, _ := bytes.Cut(data, []byte("\n\n")); bytes.HasPrefix(data, []byte("parent ")) || len(data) > 0 && data[0] != '\n' && bytes.Contains(headers, []byte("\nparent ")) {
		return nil, nil, nil, errors.New("a parent does not stand beside the tree")
	}
	return author, committer, rest, nil
}

// parseHash reads 40 hexadecimal digits.
func parseHash(s string) (plumbing.Hash, bool) {
	if len(s) != 40 || !isHex(s) {
		return plumbing.ZeroHash, false
	}
	return plumbing.NewHash(s), true
}

func isHex(s string) bool {
	for i := range len(s) {
		switch c := s[i]; {
		case '0' <= c && c <= '9', 'a' <= c && c <= 'f', 'A' <= c && c <= 'F':
		default:
			return false
		}
	}
	return true
}

// parsePerson reads "Name <address> seconds +hhmm". What cannot be read is left
// empty: old repositories hold every kind of damage here.
func parsePerson(data []byte, latin bool) Person {
	text := decodeText(data, latin)
	open := strings.IndexByte(text, '<')
	if open < 0 {
		return Person{Name: strings.TrimSpace(text)}
	}
	p := Person{Name: strings.TrimSpace(text[:open])}
	// The last '>' ends the address: damaged ones contain more than one.
	end := strings.LastIndexByte(text, '>')
	if end < open {
		p.Email = strings.TrimSpace(text[open+1:])
		return p
	}
	p.Email = strings.TrimSpace(text[open+1 : end])
	fields := timeOf(data)
	if len(fields) == 0 {
		return p
	}
	seconds, ok := parseSeconds(fields[0])
	if !ok {
		return p
	}
	offset := 0
	if len(fields) > 1 {
		offset = parseOffset(fields[1])
	}
	p.When = time.Unix(seconds, 0).In(time.FixedZone("", offset))
	return p
}

// maxSeconds is the end of the year 9999: later instants have no RFC 3339 form.
const maxSeconds = 253402300799

// parseOffset reads "+hhmm" in seconds, 0 where it is anything else.
func parseOffset(s string) int {
	if len(s) != 5 || (s[0] != '+' && s[0] != '-') {
		return 0
	}
	n, err := strconv.ParseUint(s[1:], 10, 16)
	if err != nil || n/100 > 14 || n%100 > 59 {
		return 0
	}
	seconds := int(n/100*3600 + n%100*60)
	if s[0] == '-' {
		return -seconds
	}
	return seconds
}

func isLatin1(name string) bool {
	switch strings.ToUpper(strings.TrimSpace(name)) {
	case "ISO-8859-1", "ISO8859-1", "ISO_8859-1", "LATIN1", "LATIN-1":
		return true
	}
	return false
}

func decodeText(data []byte, latin bool) string {
	if utf8.Valid(data) {
		return string(data)
	}
	if !latin {
		return strings.ToValidUTF8(string(data), "\uFFFD")
	}
	runes := make([]rune, len(data))
	for i, c := range data {
		runes[i] = rune(c)
	}
	return string(runes)
}

// subject is the first paragraph on one line, as git prints it: empty lines
// before it are passed over, blanks at the end of a line are dropped and those at
// its start stay. Like git it takes a zero byte for the end of the message, and
// no other characters than these four for blanks.
func subject(message string) string {
	message, _, _ = strings.Cut(message, "\x00")
	var parts []string
	for line := range strings.Lines(message) {
		line = strings.TrimRight(line, " \t\r\n")
		if line != "" {
			parts = append(parts, line)
		} else if len(parts) > 0 {
			break
		}
	}
	return strings.Join(parts, " ")
}
