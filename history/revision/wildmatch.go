package revision

import "strings"

// wildmatch says whether a name matches a pattern of gitignore(5): '?' and '*'
// stand for one and any number of characters other than a slash, '[...]' for one
// of a set, a backslash takes the meaning away. With pathname set, "**/" at the
// start, "/**" at the end and "/**/" between cross slashes; without it '*' and
// '?' do too. fold ignores the case of ASCII letters.
func wildmatch(pattern, name string, pathname, fold bool) bool {
	if fold {
		pattern, name = lowerASCII(pattern), lowerASCII(name)
	}
	m := matcher{pathname: pathname, fold: fold}
	return m.match(pattern, name, true)
}

// maxMatchSteps bounds the work on one pattern and name: patterns come from
// files that anyone may write, and stars in a row could try without end.
const maxMatchSteps = 1_000_000

type matcher struct {
	pathname, fold bool
	steps          int
}

// match matches bytes, as git does. start says that pattern begins a path
// component.
func (m *matcher) match(p, s string, start bool) bool {
	for len(p) > 0 {
		if m.steps++; m.steps > maxMatchSteps {
			return false
		}
		c := p[0]
		if c == '*' {
			return m.star(p, s, start)
		}
		if len(s) == 0 {
			return false
		}
		switch c {
		case '?':
			if m.pathname && s[0] == '/' {
				return false
			}
			p = p[1:]
		case '[':
			rest, ok := m.set(p[1:], s[0])
			if !ok {
				return false
			}
			p = rest
		case '\\':
			if len(p) < 2 || p[1] != s[0] {
				return false
			}
			c, p = p[1], p[2:]
		default:
			if c != s[0] {
				return false
			}
			p = p[1:]
		}
		start = c == '/'
		s = s[1:]
	}
	return len(s) == 0
}

// star matches a pattern that begins with one or more stars.
func (m *matcher) star(p, s string, start bool) bool {
	rest := strings.TrimLeft(p, "*")
	deep := !m.pathname
	slash := strings.HasPrefix(rest, "/")
	if stars := len(p) - len(rest); m.pathname && stars >= 2 && start && (rest == "" || slash || strings.HasPrefix(rest, `\/`)) {
		deep = true
		// "**/" also stands for no folder at all.
		if slash && m.match(rest[1:], s, true) {
			return true
		}
	}
	for i := 0; ; i++ {
		if m.match(rest, s[i:], false) {
			return true
		}
		if i == len(s) || s[i] == '/' && !deep || m.steps > maxMatchSteps {
			return false
		}
	}
}

// set matches a character against a set, whose opening bracket is behind us,
// and gives the pattern after it.
func (m *matcher) set(p string, c byte) (rest string, ok bool) {
	negated := false
	if p != "" && (p[0] == '!' || p[0] == '^') {
		negated = true
		p = p[1:]
	}
	matched := false
	previous := byte(0) // may begin a range
	for first := true; ; first = false {
		if p == "" {
			return "", false
		}
		at := p[0]
		switch {
		case at == ']' && !first:
			return p[1:], matched != negated && !(m.pathname && c == '/')
		case at == '\\':
			if len(p) < 2 {
				return "", false
			}
			at = p[1]
			matched = matched || c == at
			previous, p = at, p[2:]
		case at == '-' && previous != 0 && len(p) > 1 && p[1] != ']':
			high := p[1]
			p = p[2:]
			if high == '\\' {
				if p == "" {
					return "", false
				}
				high, p = p[0], p[1:]
			}
			matched = matched || previous <= c && c <= high
			previous = 0
		case at == '[' && len(p) > 1 && p[1] == ':':
			end := strings.IndexByte(p[2:], ']')
			if end < 0 {
				return "", false
			}
			name, isClass := strings.CutSuffix(p[2:2+end], ":")
			if !isClass {
				matched = matched || c == '['
				previous, p = '[', p[1:]
				continue
			}
			in, known := m.inClass(name, c)
			if !known {
				return "", false
			}
			matched = matched || in
			previous, p = 0, p[2+end+1:]
		default:
			matched = matched || c == at
			previous, p = at, p[1:]
		}
	}
}

// inClass says whether a byte is in a named class, and whether there is one of
// this name.
func (m *matcher) inClass(name string, c byte) (in, known bool) {
	lower, upper, digit := 'a' <= c && c <= 'z', 'A' <= c && c <= 'Z', '0' <= c && c <= '9'
	switch name {
	case "alnum":
		return lower || upper || digit, true
	case "alpha":
		return lower || upper, true
	case "blank":
		return c == ' ' || c == '\t', true
	case "cntrl":
		return c < ' ' || c == 0x7f, true
	case "digit":
		return digit, true
	case "graph":
		return '!' <= c && c <= '~', true
	case "lower":
		return lower, true
	case "print":
		return ' ' <= c && c <= '~', true
	case "punct":
		return '!' <= c && c <= '~' && !lower && !upper && !digit, true
	case "space":
		return c == ' ' || '\t' <= c && c <= '\r', true
	case "upper":
		return upper || m.fold && lower, true
	case "xdigit":
		return digit || 'a' <= c && c <= 'f' || 'A' <= c && c <= 'F', true
	}
	return false, false
}
