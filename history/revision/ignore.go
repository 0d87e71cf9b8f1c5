package revision

import (
	"bytes"
	"errors"
	"io/fs"
	"os"
	"path"
	"path/filepath"
	"runtime"
	"strings"
)

const (
	maxIgnoreFile = 4 << 20 // bytes
	maxPatterns   = 100_000 // in one file
)

// pattern is one line of an ignore file.
type pattern struct {
	text     string // without what the fields below say
	negated  bool   // began with '!'
	dirOnly  bool   // ended in a slash
	anywhere bool   // has no slash: matches the last name of a path
}

// ignoreFile is the patterns of one file and the folder they count from.
type ignoreFile struct {
	base     string // with slashes, from the root of the working tree; "" for the root
	patterns []pattern
}

// parseIgnore reads the format of gitignore(5).
func parseIgnore(data []byte) []pattern {
	data = bytes.TrimPrefix(data, []byte("\xef\xbb\xbf"))
	var out []pattern
	for len(data) > 0 && len(out) < maxPatterns {
		var line []byte
		line, data = cutLine(data)
		text := trimSpaces(strings.TrimSuffix(string(line), "\r"))
		if text == "" || text[0] == '#' {
			continue
		}
		var p pattern
		if text[0] == '!' {
			p.negated = true
			text = text[1:]
		}
		if strings.HasSuffix(text, "/") {
			p.dirOnly = true
			text = text[:len(text)-1]
		}
		p.anywhere = !strings.Contains(text, "/")
		p.text = strings.TrimPrefix(text, "/")
		out = append(out, p)
	}
	return out
}

// trimSpaces removes spaces at the end, except one that a backslash protects.
func trimSpaces(s string) string {
	end := 0
	for i := 0; i < len(s); i++ {
		switch s[i] {
		case ' ':
			continue
		case '\\':
			i++
		}
		end = min(i+1, len(s))
	}
	return s[:end]
}

// match says whether the last pattern that matches a path excludes it, and
// whether one matches at all. The path counts from the root of the working tree.
func (f *ignoreFile) match(name string, isDir, fold bool) (excluded, matched bool) {
	rel := name
	if f.base != "" {
		var ok bool
		if rel, ok = strings.CutPrefix(name, f.base+"/"); !ok {
			return false, false
		}
	}
	for i := len(f.patterns) - 1; i >= 0; i-- {
		p := f.patterns[i]
		if p.dirOnly && !isDir {
			continue
		}
		if p.anywhere {
			if wildmatch(p.text, path.Base(rel), false, fold) {
				return !p.negated, true
			}
		} else if p.matchPath(rel, fold) {
			return !p.negated, true
		}
	}
	return false, false
}

// matchPath matches a path as git does: the text before the first special
// character is compared by itself, and only what is behind it is matched as a
// pattern of its own. So the stars of "a**/b" cross folders as those at the start
// of a pattern do, against what gitignore(5) says of stars beside other text.
func (p pattern) matchPath(rel string, fold bool) bool {
	n := strings.IndexAny(p.text, `*?[\`)
	if n < 0 {
		n = len(p.text)
	}
	if n > len(rel) {
		return false
	}
	text, head := p.text[:n], rel[:n]
	if fold {
		text, head = lowerASCII(text), lowerASCII(head)
	}
	return text == head && wildmatch(p.text[n:], rel[n:], true, fold)
}

// ignores are the files that apply, the ones that prevail last.
type ignores struct {
	files []*ignoreFile
	fold  bool
}

// excluded says whether a path is ignored by a pattern of its own. Whether a
// folder above it is ignored is for the caller to know: then nothing below can
// be taken in again.
func (g ignores) excluded(name string, isDir bool) bool {
	for i := len(g.files) - 1; i >= 0; i-- {
		if excluded, matched := g.files[i].match(name, isDir, g.fold); matched {
			return excluded
		}
	}
	return false
}

// with gives the rules for a folder that may have a file of its own.
func (g ignores) with(root, dir string) (ignores, error) {
	f, err := readIgnore(filepath.Join(root, filepath.FromSlash(dir), ".gitignore"), true)
	if err != nil {
		return g, orUnreadable("ignore rules cannot be read", err)
	}
	if f == nil {
		return g, nil
	}
	if dir != "." {
		f.base = dir
	}
	g.files = append(g.files[:len(g.files):len(g.files)], f)
	return g, nil
}

// readIgnore reads one file; nil if there is none. git does not follow a link
// called .gitignore inside the working tree.
func readIgnore(name string, inTree bool) (*ignoreFile, error) {
	stat := os.Stat
	if inTree {
		stat = os.Lstat
	}
	info, err := stat(name)
	if errors.Is(err, fs.ErrNotExist) || err == nil && !info.Mode().IsRegular() {
		return nil, nil
	}
	if err != nil {
		return nil, err
	}
	data, err := readBounded(name, maxIgnoreFile)
	if err != nil {
		return nil, err
	}
	return &ignoreFile{patterns: parseIgnore(data)}, nil
}

// userIgnores gives the rules that stand outside the working tree's folders:
// core.excludesFile and info/exclude.
func (r *Repo) userIgnores() (ignores, error) {
	home := homeDir()
	o, err := r.userConfig(home)
	if err != nil {
		return ignores{}, err
	}
	o = append(o, r.config...)
	g := ignores{fold: o.flag("core.ignorecase", false)}
	name, ok := o.get("core.excludesfile")
	switch {
	case ok:
		name = expandHome(name, home)
	case xdgDir(home) != "":
		name = filepath.Join(xdgDir(home), "ignore")
	}
	for _, file := range []string{name, filepath.Join(r.at.commonDir, "info", "exclude")} {
		if file == "" {
			continue
		}
		f, err := readIgnore(file, false)
		if err != nil {
			return ignores{}, err
		}
		if f != nil {
			g.files = append(g.files, f)
		}
	}
	return g, nil
}

// userConfig reads the configuration of the system and of the user, as git does.
func (r *Repo) userConfig(home string) (options, error) {
	var names []string
	if system, ok := os.LookupEnv("GIT_CONFIG_SYSTEM"); ok {
		names = append(names, system)
	} else if runtime.GOOS != "windows" {
		names = append(names, "/etc/gitconfig")
	}
	if v := os.Getenv("GIT_CONFIG_NOSYSTEM"); v != "" && (options{{"x", v}}).flag("x", false) {
		names = nil
	}
	if global, ok := os.LookupEnv("GIT_CONFIG_GLOBAL"); ok {
		names = append(names, global)
	} else {
		if dir := xdgDir(home); dir != "" {
			names = append(names, filepath.Join(dir, "config"))
		}
		if home != "" {
			names = append(names, filepath.Join(home, ".gitconfig"))
		}
	}
	var out options
	for _, name := range names {
		if name == "" || name == os.DevNull {
			continue
		}
		o, err := readConfig(name, r.at.gitDir, home)
		if err != nil {
			return nil, err
		}
		out = append(out, o...)
	}
	return out, nil
}
