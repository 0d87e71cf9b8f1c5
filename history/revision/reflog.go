package revision

import (
	"errors"
	"fmt"
	"io/fs"
	"path/filepath"
	"strconv"
	"strings"

	"github.com/go-git/go-git/v5/plumbing"
)

const maxReflog = 64 << 20 // bytes

// resolveAt resolves NAME@{N}, @{N}, @{-N} and NAME@{upstream}.
func (r *Repo) resolveAt(name, at, rev string) (plumbing.Hash, error) {
	what, ok := strings.CutSuffix(strings.TrimPrefix(at, "@{"), "}")
	if !ok {
		return plumbing.ZeroHash, unknown(rev, "@{ is not closed")
	}
	switch strings.ToLower(what) {
	case "u", "upstream":
		return r.upstream(name, rev)
	}
	n, err := strconv.Atoi(what)
	switch {
	case err != nil || what[0] == '+':
		return plumbing.ZeroHash, unknown(rev, fmt.Sprintf("@{%s} is not supported; @{N}, @{-N} and @{upstream} are", what))
	case n < 0 && name == "":
		return r.previousBranch(-n, rev)
	case n < 0 || what[0] == '-':
		return plumbing.ZeroHash, unknown(rev, "@{-N} stands alone")
	}
	return r.earlier(name, n, rev)
}

// fullName gives the first full reference name that a short one stands for.
func (r *Repo) fullName(name, rev string) (string, error) {
	if name == "" || name == "@" {
		name = "HEAD"
	}
	for _, rule := range refRules {
		full := fmt.Sprintf(rule, name)
		_, ok, _, err := r.ref(full)
		if err != nil {
			return "", err
		}
		if ok {
			return full, nil
		}
	}
	return "", unknown(rev, fmt.Sprintf("no reference %q", name))
}

// headBranch is the full name of the branch that HEAD is on, "" when detached.
func (r *Repo) headBranch() (string, error) {
	text, err := readSmall(filepath.Join(r.at.gitDir, "HEAD"))
	if err != nil {
		return "", corrupt("HEAD cannot be read", err)
	}
	target, ok := strings.CutPrefix(text, "ref:")
	if !ok {
		return "", nil
	}
	return strings.TrimSpace(target), nil
}

// upstream resolves the remote-tracking branch that a branch is set to follow.
func (r *Repo) upstream(name, rev string) (plumbing.Hash, error) {
	full := "refs/heads/" + strings.TrimPrefix(name, "refs/heads/")
	if name == "" || name == "@" || name == "HEAD" {
		var err error
		if full, err = r.headBranch(); err != nil {
			return plumbing.ZeroHash, err
		}
	}
	branch := strings.TrimPrefix(full, "refs/heads/")
	remote, _ := r.config.get("branch." + branch + ".remote")
	merge, ok := r.config.get("branch." + branch + ".merge")
	if !ok || remote == "" {
		return plumbing.ZeroHash, unknown(rev, fmt.Sprintf("branch %q has no upstream", branch))
	}
	target := merge
	if remote != "." {
		if target = r.tracked(remote, merge); target == "" {
			return plumbing.ZeroHash, unknown(rev, fmt.Sprintf("%s of remote %q is not fetched to any branch", merge, remote))
		}
	}
	h, ok, _, err := r.ref(target)
	if err == nil && !ok {
		err = unknown(rev, fmt.Sprintf("%s is not here", target))
	}
	return h, err
}

// tracked maps a reference of a remote to the local one that a fetch writes it
// to, by the fetch lines of the configuration.
func (r *Repo) tracked(remote, name string) string {
	for _, o := range r.config {
		if o.key != "remote."+remote+".fetch" {
			continue
		}
		from, to, ok := strings.Cut(strings.TrimPrefix(o.value, "+"), ":")
		if !ok {
			continue
		}
		if from == name {
			return to
		}
		before, after, star := strings.Cut(from, "*")
		if star && len(name) >= len(before)+len(after) && strings.HasPrefix(name, before) && strings.HasSuffix(name, after) {
			return strings.Replace(to, "*", name[len(before):len(name)-len(after)], 1)
		}
	}
	return ""
}

// reflogLine is one change of a reference.
type reflogLine struct {
	old, new plumbing.Hash
	message  string
}

// reflog reads the recorded changes of a reference, oldest first. A line is two
// hashes, a person, a tab and a message.
func (r *Repo) reflog(full string) ([]reflogLine, error) {
	data, err := readBounded(filepath.Join(r.refDir(full), "logs", filepath.FromSlash(full)), maxReflog)
	if errors.Is(err, fs.ErrNotExist) {
		return nil, nil
	}
	if err != nil {
		return nil, corrupt(fmt.Sprintf("reflog of %q cannot be read", full), err)
	}
	var out []reflogLine
	for len(data) > 0 {
		var line []byte
		line, data = cutLine(data)
		if len(line) == 0 {
			continue
		}
		if len(line) < 82 {
			return nil, corrupt(fmt.Sprintf("reflog of %q holds a malformed line", full), nil)
		}
		old, ok1 := parseHash(string(line[:40]))
		now, ok2 := parseHash(string(line[41:81]))
		if !ok1 || !ok2 {
			return nil, corrupt(fmt.Sprintf("reflog of %q holds a malformed line", full), nil)
		}
		_, message, _ := strings.Cut(string(line), "\t")
		out = append(out, reflogLine{old, now, message})
	}
	return out, nil
}

// earlier resolves what a reference was n changes ago; without a name, the
// branch that HEAD is on.
func (r *Repo) earlier(name string, n int, rev string) (plumbing.Hash, error) {
	var full string
	var err error
	if name == "" {
		if full, err = r.headBranch(); full == "" && err == nil {
			full = "HEAD"
		}
	} else {
		full, err = r.fullName(name, rev)
	}
	if err != nil {
		return plumbing.ZeroHash, err
	}
	lines, err := r.reflog(full)
	if err != nil {
		return plumbing.ZeroHash, err
	}
	switch {
	case n < len(lines):
		return lines[len(lines)-1-n].new, nil
	case n == len(lines) && n > 0 && !lines[0].old.IsZero():
		return lines[0].old, nil // the state before the oldest change that is recorded
	case n == 0:
		if h, ok, _, err := r.ref(full); err != nil || ok {
			return h, err
		}
	}
	return plumbing.ZeroHash, unknown(rev, fmt.Sprintf("the reflog of %q has %d entries", full, len(lines)))
}

// previousBranch resolves the branch that was checked out n switches ago.
func (r *Repo) previousBranch(n int, rev string) (plumbing.Hash, error) {
	lines, err := r.reflog("HEAD")
	if err != nil {
		return plumbing.ZeroHash, err
	}
	for i := len(lines) - 1; i >= 0; i-- {
		move, ok := strings.CutPrefix(lines[i].message, "checkout: moving from ")
		if !ok {
			continue
		}
		if n--; n > 0 {
			continue
		}
		from, _, _ := strings.Cut(move, " to ")
		if h, ok := parseHash(from); ok {
			return h, nil
		}
		if h, ok, _, err := r.ref("refs/heads/" + from); err != nil || ok {
			return h, err
		}
		return plumbing.ZeroHash, unknown(rev, fmt.Sprintf("branch %q is gone", from))
	}
	return plumbing.ZeroHash, unknown(rev, "the reflog of HEAD has no such switch")
}
