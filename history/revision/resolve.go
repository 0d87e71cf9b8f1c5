package revision

import (
	"errors"
	"fmt"
	"regexp"
	"strconv"
	"strings"

	"github.com/go-git/go-git/v5/plumbing"
)

const (
	maxRevision = 4096 // bytes of a revision as typed
	minAbbrev   = 4    // digits of an abbreviated hash, as in git
	maxListed   = 8    // candidates named in an error
	maxTagDepth = 32   // tags that point to tags
)

// Resolve gives the commit that a revision names, in the manner of
// gitrevisions(7): a full or abbreviated hash, HEAD or @, a tag, a branch,
// origin/x, refs/..., the output of git describe, each followed by any number of
// ~N, ^N, ^{}, ^{commit}; also NAME@{N}, @{-N} and NAME@{upstream}. Forms that
// choose by date or by the text of a message are refused.
//
// The errors are of class ErrUnknown, ErrAmbiguous, ErrNotCommit, ErrShallow,
// ErrMissingObject, ErrUnsupported, ErrUnreadable or ErrCorrupt.
func (r *Repo) Resolve(rev string) (Commit, error) {
	h, err := r.resolve(rev)
	if err != nil {
		return Commit{}, err
	}
	return r.commit(h)
}

func (r *Repo) resolve(rev string) (plumbing.Hash, error) {
	if rev == "" || len(rev) > maxRevision || rev[0] == '-' {
		return plumbing.ZeroHash, unknown(rev, "")
	}
	base, suffixes, err := splitRevision(rev)
	if err != nil {
		return plumbing.ZeroHash, unknown(rev, err.Error())
	}
	h, err := r.resolveBase(base, rev)
	if err != nil {
		return plumbing.ZeroHash, err
	}
	if h, err = r.peelFor(h, rev); err != nil {
		return plumbing.ZeroHash, err
	}
	for _, s := range suffixes {
		if h, err = r.follow(h, s, rev); err != nil {
			return plumbing.ZeroHash, err
		}
	}
	return h, nil
}

// suffix is one step from a commit: generations back along first parents, or
// the parent with a number.
type suffix struct {
	tilde bool
	n     int
}

// splitRevision cuts ~N, ^N and ^{type} off the end of a revision.
func splitRevision(rev string) (base string, suffixes []suffix, err error) {
	end := strings.IndexAny(rev, "~^")
	if end < 0 {
		return rev, nil, nil
	}
	base, rest := rev[:end], rev[end:]
	for rest != "" {
		mark := rest[0]
		rest = rest[1:]
		if mark == '^' && strings.HasPrefix(rest, "{") {
			kind, after, ok := strings.Cut(rest[1:], "}")
			switch {
			case !ok || kind != "" && kind != "commit" && kind != "object":
				return "", nil, fmt.Errorf("^{%s} does not lead to a commit; ^{commit} and ^{} do", kind)
			}
			rest = after
			continue // the base is peeled to a commit in any case
		}
		if mark != '^' && mark != '~' {
			return "", nil, fmt.Errorf("%q does not follow ~ or ^", mark)
		}
		digits := 0
		for digits < len(rest) && rest[digits] >= '0' && rest[digits] <= '9' {
			digits++
		}
		s := suffix{tilde: mark == '~', n: 1}
		if digits > 0 {
			if s.n, err = strconv.Atoi(rest[:digits]); err != nil {
				return "", nil, fmt.Errorf("%s is too large a number", rest[:digits])
			}
		}
		rest = rest[digits:]
		suffixes = append(suffixes, s)
	}
	return base, suffixes, nil
}

// follow takes one step back from a commit.
func (r *Repo) follow(h plumbing.Hash, s suffix, rev string) (plumbing.Hash, error) {
	steps, number := 1, s.n
	if s.tilde {
		steps, number = s.n, 1
	}
	if number == 0 {
		return h, nil // ^0 is the commit itself
	}
	for range steps {
		l, err := r.links(h)
		if err != nil {
			return h, err
		}
		if l.boundary {
			return h, r.shallowError(fmt.Sprintf("revision %q", rev), h)
		}
		if number > len(l.parents) {
			return h, unknown(rev, fmt.Sprintf("commit %s has %d parents", h, len(l.parents)))
		}
		h = l.parents[number-1]
	}
	return h, nil
}

func (r *Repo) shallowError(what string, at plumbing.Hash) *Error {
	return &Error{
		Kind: ErrShallow, Text: fmt.Sprintf("%s: history ends at commit %s in this shallow clone", what, at),
		Hint: "fetch the rest with `git fetch --unshallow`",
	}
}

func unknown(rev, why string) *Error {
	e := &Error{
		Kind: ErrUnknown, Text: fmt.Sprintf("unknown revision %q", rev),
		Hint: "name a branch, a tag, a commit hash or a form such as HEAD~2; `git fetch --tags` brings what is not here yet",
	}
	if why != "" {
		e.Err = errors.New(why)
	}
	return e
}

// refRules are the places where git looks for a name, in this order.
var refRules = []string{"%s", "refs/%s", "refs/tags/%s", "refs/heads/%s", "refs/remotes/%s", "refs/remotes/%s/HEAD"}

// resolveBase resolves a revision without its steps.
func (r *Repo) resolveBase(base, rev string) (plumbing.Hash, error) {
	if base == "" {
		return plumbing.ZeroHash, unknown(rev, "nothing stands before ~ or ^")
	}
	if h, ok := parseHash(base); ok {
		if _, err := r.store.find(h); errors.Is(err, errAbsent) {
			return h, r.unknownHash(rev, "no such object here")
		} else if err != nil {
			return h, err
		}
		return h, nil
	}
	if i := strings.Index(base, "@{"); i >= 0 {
		return r.resolveAt(base[:i], base[i:], rev)
	}
	if base == "@" {
		base = "HEAD"
	}
	h, ok, err := r.resolveName(base, rev)
	if err == nil && ok {
		err = r.checkNameIsNoHash(base, h, rev)
	}
	if err != nil || ok {
		return h, err
	}
	if h, ok, err = r.resolveAbbrev(base, rev); err != nil || ok {
		return h, err
	}
	// git describe writes NAME-COUNT-gHASH.
	if i := strings.LastIndex(base, "-g"); i > 0 {
		if h, ok, err = r.resolveAbbrev(base[i+2:], rev); err != nil || ok {
			return h, err
		}
	}
	if len(base) >= minAbbrev && isHex(base) {
		return h, r.unknownHash(rev, "")
	}
	return h, unknown(rev, "")
}

// unknownHash is unknown for a hash: a repository that lacks objects may lack
// just that one.
func (r *Repo) unknownHash(rev, why string) *Error {
	e := unknown(rev, why)
	if hint := r.lackingHint(); hint != "" {
		e.Hint = hint
	}
	return e
}

// resolveName looks a name up under each of the rules. Names that mean different
// commits under different rules are refused: git would warn and go on, but a
// record must not rest on a warning.
func (r *Repo) resolveName(name, rev string) (plumbing.Hash, bool, error) {
	var first plumbing.Hash
	var hits []string
	differ := false
	for _, rule := range refRules {
		full := fmt.Sprintf(rule, name)
		h, ok, unborn, err := r.ref(full)
		if err != nil {
			return h, false, err
		}
		if !ok {
			if full == "HEAD" && unborn != "" && unborn != "HEAD" {
				return h, false, unknown(rev, fmt.Sprintf("branch %q has no commit yet", strings.TrimPrefix(unborn, "refs/heads/")))
			}
			continue
		}
		if len(hits) == 0 {
			first = h
		} else if a, err := r.peelFor(first, rev); err != nil {
			return h, false, err
		} else if b, err := r.peelFor(h, rev); err != nil || a != b {
			differ = true
		}
		hits = append(hits, full)
	}
	if differ {
		return first, false, &Error{
			Kind: ErrAmbiguous, Text: fmt.Sprintf("revision %q is ambiguous: %s", rev, strings.Join(hits, ", ")),
			Hint: ambiguousHint(name, hits),
		}
	}
	return first, len(hits) > 0, nil
}

// checkNameIsNoHash refuses a name that somebody may have typed as the hash of
// another commit, abbreviated or as git describe writes it. Git takes the name, with
// a warning at most. A name from refs/ on is no hash, and a whole hash
// is never looked up as a name, here and in git.
func (r *Repo) checkNameIsNoHash(name string, h plumbing.Hash, rev string) error {
	digits := name
	if m := described.FindStringSubmatch(name); m != nil {
		digits = m[1]
	}
	if len(digits) < minAbbrev || len(digits) > 40 || !isHex(digits) || strings.HasPrefix(name, "refs/") {
		return nil // most names, at no cost
	}
	named, err := r.peelFor(h, rev)
	if err != nil {
		return err
	}
	commits, _, err := r.withPrefix(digits)
	if err != nil {
		return err
	}
	var others []string
	for _, c := range commits {
		if peeled, err := r.peel(c); err != nil {
			return err
		} else if peeled != named {
			others = append(others, c.String())
		}
	}
	if len(others) == 0 {
		return nil
	}
	if len(others) > maxListed {
		others = append(others[:maxListed], "...")
	}
	return &Error{
		Kind: ErrAmbiguous, Text: fmt.Sprintf("revision %q is ambiguous: the name of %s, and the hash of %s", rev, named, strings.Join(others, ", ")),
		Hint: "write the full name, such as refs/heads/" + name + " or refs/tags/" + name + ", or more digits of the hash",
	}
}

// described is what git describe writes of a commit behind a tag.
var described = regexp.MustCompile(`-[0-9]+-g([0-9a-fA-F]+)$`)

// ambiguousHint says how to name one of several references. Where the name is
// already full, as HEAD is, it can only be made clear again by taking the other
// one away.
func ambiguousHint(name string, hits []string) string {
	if hits[0] != name {
		return "write the full name, such as " + hits[0]
	}
	return fmt.Sprintf("for the second write %s; for the first write the hash of its commit, or rename %s", hits[1], hits[1])
}

// resolveAbbrev finds the commit, or the tag of one, whose hash begins with
// some digits.
func (r *Repo) resolveAbbrev(digits, rev string) (plumbing.Hash, bool, error) {
	if len(digits) < minAbbrev || len(digits) > 40 || !isHex(digits) {
		return plumbing.ZeroHash, false, nil
	}
	hits, hashes, err := r.withPrefix(digits)
	if err != nil {
		return plumbing.ZeroHash, false, err
	}
	var commits []string
	var hit plumbing.Hash
	for _, hit = range hits {
		commits = append(commits, hit.String())
	}
	switch {
	case len(commits) == 1:
		return hit, true, nil
	case len(commits) > 1:
		if len(commits) > maxListed {
			commits = append(commits[:maxListed], "...")
		}
		return hit, false, &Error{
			Kind: ErrAmbiguous, Text: fmt.Sprintf("revision %q is ambiguous: %s", rev, strings.Join(commits, ", ")),
			Hint: "write more digits of the hash",
		}
	case len(hashes) > 0:
		return hit, false, &Error{
			Kind: ErrNotCommit, Text: fmt.Sprintf("revision %q names an object that is not a commit: %s", rev, hashes[0]),
			Hint: "name a commit, a tag or a branch",
		}
	}
	return hit, false, nil
}

// withPrefix gives the commits, and the tags of commits, whose hash begins with
// some digits, and the objects of any kind whose hash does.
func (r *Repo) withPrefix(digits string) (commits, all []plumbing.Hash, err error) {
	const limit = 10_000 // more candidates than this are ambiguous by any measure
	all, err = r.store.withPrefix(strings.ToLower(digits), limit)
	if err != nil {
		return nil, nil, err
	}
	for _, h := range all {
		if _, err := r.peel(h); errors.Is(err, ErrNotCommit) {
			continue
		} else if err != nil {
			return nil, nil, err
		}
		commits = append(commits, h)
	}
	return commits, all, nil
}

// peel follows tags to the commit. Its error is of class ErrNotCommit where
// they lead to something else.
func (r *Repo) peel(h plumbing.Hash) (plumbing.Hash, error) {
	for range maxTagDepth {
		o, err := r.find(h, "a revision")
		if err != nil {
			return h, err
		}
		switch o.kind {
		case plumbing.CommitObject:
			return h, nil
		case plumbing.TagObject:
			data, err := r.read(h, plumbing.TagObject, maxCommit, "a tag")
			if err != nil {
				return h, err
			}
			if h, err = parseTag(data); err != nil {
				return h, corrupt(fmt.Sprintf("tag %s is malformed", o.hash), err)
			}
		default:
			return h, &Error{
				Kind: ErrNotCommit, Text: fmt.Sprintf("object %s is a %s, not a commit", h, o.kind),
				Hint: "name a commit, a tag or a branch",
			}
		}
	}
	return h, corrupt(fmt.Sprintf("tag %s: too many tags point to one another", h), nil)
}

// peelFor is peel with an error that names the revision.
func (r *Repo) peelFor(h plumbing.Hash, rev string) (plumbing.Hash, error) {
	peeled, err := r.peel(h)
	var e *Error
	if errors.As(err, &e) {
		named := *e
		named.Text = fmt.Sprintf("revision %q: %s", rev, e.Text)
		return peeled, &named
	}
	return peeled, err
}
