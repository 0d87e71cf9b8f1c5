package revision

import (
	"bytes"
	"errors"
	"fmt"
	"io/fs"
	"path/filepath"
	"strconv"
	"strings"

	"github.com/go-git/go-git/v5/plumbing/format/config"
)

const (
	maxConfigFile  = 4 << 20 // bytes
	maxConfigDepth = 10      // files that include one another; git's own limit
)

// option is one line of a configuration: the key is "section.name" in lower
// case, or "section.Subsection.name" with the subsection as written.
type option struct {
	key, value string
}

// options are the lines of one or more configuration files, later ones
// prevailing.
type options []option

func (o options) get(key string) (string, bool) {
	for i := len(o) - 1; i >= 0; i-- {
		if o[i].key == key {
			return o[i].value, true
		}
	}
	return "", false
}

// flag reads a boolean; a key with no value is true, as in git.
func (o options) flag(key string, otherwise bool) bool {
	v, ok := o.get(key)
	if !ok {
		return otherwise
	}
	switch strings.ToLower(v) {
	case "", "true", "yes", "on":
		return true
	case "false", "no", "off":
		return false
	}
	n, err := strconv.Atoi(v)
	return err == nil && n != 0
}

// readConfig reads a configuration file and what it includes. A file that is
// not there is an empty one.
func readConfig(name, gitDir, home string) (options, error) {
	return readConfigDepth(name, gitDir, home, 0)
}

func readConfigDepth(name, gitDir, home string, depth int) (options, error) {
	if depth > maxConfigDepth {
		return nil, fmt.Errorf("configuration %q: files include one another more than %d deep", name, maxConfigDepth)
	}
	data, err := readBounded(name, maxConfigFile)
	if errors.Is(err, fs.ErrNotExist) {
		return nil, nil
	}
	if err != nil {
		return nil, err
	}
	raw := config.New()
	if err := config.NewDecoder(bytes.NewReader(data)).Decode(raw); err != nil {
		return nil, fmt.Errorf("configuration %q: %w", name, err)
	}
	var out options
	for _, s := range raw.Sections {
		section := strings.ToLower(s.Name)
		for _, o := range s.Options {
			out = append(out, option{section + "." + strings.ToLower(o.Key), o.Value})
		}
		for _, sub := range s.Subsections {
			for _, o := range sub.Options {
				out = append(out, option{section + "." + sub.Name + "." + strings.ToLower(o.Key), o.Value})
			}
		}
	}
	return include(out, name, gitDir, home, depth)
}

// include puts the lines of included files behind the line that names them.
func include(in options, name, gitDir, home string, depth int) (options, error) {
	var out options
	for _, o := range in {
		out = append(out, o)
		condition, conditional := "", false
		if rest, ok := strings.CutPrefix(o.key, "includeif."); ok {
			condition, conditional = strings.CutSuffix(rest, ".path")
		}
		if o.key != "include.path" && !(conditional && includeHolds(condition, name, gitDir, home)) {
			continue
		}
		path := expandHome(o.value, home)
		if !filepath.IsAbs(path) {
			path = filepath.Join(filepath.Dir(name), path)
		}
		more, err := readConfigDepth(path, gitDir, home, depth+1)
		if err != nil {
			return nil, err
		}
		out = append(out, more...)
	}
	return out, nil
}

// includeHolds reads the conditions gitdir: and gitdir/i:. Any other condition
// does not hold.
func includeHolds(condition, name, gitDir, home string) bool {
	fold := false
	pattern, ok := strings.CutPrefix(condition, "gitdir:")
	if !ok {
		if pattern, fold = strings.CutPrefix(condition, "gitdir/i:"); !fold {
			return false
		}
	}
	pattern = filepath.ToSlash(expandHome(pattern, home))
	if rest, ok := strings.CutPrefix(pattern, "./"); ok {
		pattern = filepath.ToSlash(filepath.Dir(name)) + "/" + rest
	} else if !filepath.IsAbs(filepath.FromSlash(pattern)) {
		pattern = "**/" + pattern
	}
	if strings.HasSuffix(pattern, "/") {
		pattern += "**"
	}
	return wildmatch(pattern, filepath.ToSlash(gitDir), true, fold)
}

func expandHome(path, home string) string {
	if rest, ok := strings.CutPrefix(path, "~/"); ok && home != "" {
		return filepath.Join(home, filepath.FromSlash(rest))
	}
	return filepath.FromSlash(path)
}

// checkFormat refuses what this package cannot read. The extensions are
// checked by name rather than left to a library: an unknown one may change what
// every object means.
func checkFormat(o options, dir string) error {
	refuse := func(what, hint string) error {
		return &Error{Kind: ErrUnsupported, Text: fmt.Sprintf("repository %q: %s", dir, what), Hint: hint}
	}
	version := 0
	if v, ok := o.get("core.repositoryformatversion"); ok {
		n, err := strconv.Atoi(v)
		if err != nil || n < 0 || n > 1 {
			return refuse(fmt.Sprintf("repository format version %q is not supported, 0 and 1 are", v), convertHint)
		}
		version = n
	}
	for _, line := range o {
		name, ok := strings.CutPrefix(line.key, "extensions.")
		if !ok {
			continue
		}
		switch name {
		case "noop", "noop-v1", "preciousobjects", "partialclone", "worktreeconfig", "relativeworktrees":
		case "objectformat":
			if !strings.EqualFold(line.value, "sha1") {
				return refuse(fmt.Sprintf("object format %q is not supported, sha1 is", line.value), convertHint)
			}
		case "refstorage":
			if !strings.EqualFold(line.value, "files") {
				return refuse(fmt.Sprintf("reference storage %q is not supported, files is", line.value),
					"convert it with `git refs migrate --ref-format=files`, or use a clone made with --ref-format=files")
			}
		default:
			// Git itself ignores extensions it does not know under version 0.
			if version >= 1 {
				return refuse(fmt.Sprintf("extension %q is not supported", name), convertHint)
			}
		}
	}
	return nil
}

const convertHint = "use a clone made with `git init --object-format=sha1` and no further extensions"
