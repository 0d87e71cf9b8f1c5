package revision

import (
	"bytes"
	"errors"
	"fmt"
	"io/fs"
	"path/filepath"
	"strings"
	"sync"

	"github.com/go-git/go-git/v5/plumbing"
)

// Repo is an open repository. All its methods may be called at the same time
// from several goroutines, except Close.
type Repo struct {
	at      layout
	config  options // of the repository alone, the user's not included
	store   *store
	partial bool                   // a clone that lacks objects on purpose
	shallow map[plumbing.Hash]bool // where a shallow clone ends

	trees treeCache

	named     sync.Once // guards names and namedErr
	names     map[plumbing.Hash]string
	namedErr  error
	linksMu   sync.Mutex
	linksSeen map[plumbing.Hash]links
}

// Open opens the repository at or above a folder, for reading. Working trees,
// linked worktrees, bare repositories and .git folders will do.
//
// The errors are of class ErrNoRepository, ErrUnsupported, ErrUnreadable or
// ErrCorrupt.
func Open(dir string) (*Repo, error) {
	at, err := discover(dir)
	if err != nil {
		return nil, err
	}
	r := &Repo{at: at, linksSeen: map[plumbing.Hash]links{}}
	if err := r.configure(); err != nil {
		return nil, err
	}
	if r.shallow, err = readShallow(filepath.Join(at.commonDir, "shallow")); err != nil {
		return nil, corrupt("list of shallow commits cannot be read", err)
	}
	if err := r.refuseShipped(); err != nil {
		return nil, err
	}
	if r.store, err = newStore(at.commonDir); err != nil {
		return nil, corrupt(fmt.Sprintf("repository %q cannot be read", at.commonDir), err)
	}
	return r, nil
}

// configure reads the repository's own configuration, checks its format and
// settles where the working tree is.
func (r *Repo) configure() error {
	home := homeDir()
	o, err := readConfig(filepath.Join(r.at.commonDir, "config"), r.at.gitDir, home)
	if err == nil && o.flag("extensions.worktreeconfig", false) {
		var own options
		own, err = readConfig(filepath.Join(r.at.gitDir, "config.worktree"), r.at.gitDir, home)
		o = append(o, own...)
	}
	if err != nil {
		return corrupt(fmt.Sprintf("configuration of repository %q cannot be read", r.at.commonDir), err)
	}
	if err := checkFormat(o, r.at.commonDir); err != nil {
		return err
	}
	r.config = o
	for _, line := range o {
		if line.key == "extensions.partialclone" || strings.HasPrefix(line.key, "remote.") && strings.HasSuffix(line.key, ".promisor") {
			r.partial = true
		}
	}
	if r.at.gitDir != r.at.commonDir {
		return nil // a linked worktree has files even where the main repository is bare
	}
	if dir, ok := o.get("core.worktree"); ok && dir != "" {
		r.at.workTree = resolvePath(r.at.gitDir, dir)
		return nil
	}
	if o.flag("core.bare", r.at.workTree == "") {
		r.at.workTree = ""
	}
	return nil
}

// Close closes the files of the repository. File systems and files that came
// from it must not be used afterwards.
func (r *Repo) Close() error { return r.store.close() }

// CommonDir is the absolute path of the common Git folder, which linked
// worktrees share.
func (r *Repo) CommonDir() string { return r.at.commonDir }

// WorkTree is the absolute path of the root of the working tree, and false for
// a bare repository.
func (r *Repo) WorkTree() (string, bool) { return r.at.workTree, r.at.workTree != "" }

// readShallow reads the list of commits at which a shallow clone ends.
func readShallow(name string) (map[plumbing.Hash]bool, error) {
	data, err := readBounded(name, maxConfigFile)
	if errors.Is(err, fs.ErrNotExist) {
		return nil, nil
	}
	if err != nil {
		return nil, err
	}
	out := map[plumbing.Hash]bool{}
	for line := range bytes.Lines(data) {
		h, ok := parseHash(string(bytes.TrimSpace(line)))
		if !ok {
			return nil, fmt.Errorf("%q is not a hash", bytes.TrimSpace(line))
		}
		out[h] = true
	}
	return out, nil
}

// find locates an object. what says what it is needed for.
func (r *Repo) find(h plumbing.Hash, what string) (*object, error) {
	o, err := r.store.find(h)
	if errors.Is(err, errAbsent) {
		return nil, r.missing(h, what)
	}
	return o, err
}

// read gives the content of an object that must be of a kind and have at most
// limit bytes.
func (r *Repo) read(h plumbing.Hash, kind plumbing.ObjectType, limit int64, what string) ([]byte, error) {
	if got, data, ok := r.store.readAtMost(h, limit); ok && got == kind {
		return data, nil
	}
	o, err := r.find(h, what)
	if err != nil {
		return nil, err
	}
	if o.kind != kind {
		return nil, malformed(fmt.Sprintf("object %s is a %s, a %s is needed for %s", h, o.kind, kind, what), nil)
	}
	if o.size > limit {
		return nil, &Error{
			Kind: ErrTooLarge,
			Text: fmt.Sprintf("%s %s has %d bytes, at most %d are read", kind, h, o.size, limit),
		}
	}
	return r.content(o, what)
}

// content reads a whole object. A loose one may have been packed since it was
// found; then it is found again, once.
func (r *Repo) content(o *object, what string) ([]byte, error) {
	data, err := o.read()
	if !errors.Is(err, fs.ErrNotExist) {
		return data, err
	}
	if o, err = r.find(o.hash, what); err != nil {
		return nil, err
	}
	return o.read()
}

func (r *Repo) missing(h plumbing.Hash, what string) *Error {
	hint := r.lackingHint()
	if hint == "" {
		hint = "fetch it: `git fetch --refetch`, or use a complete clone"
	}
	return &Error{
		Kind: ErrMissingObject, Text: fmt.Sprintf("object %s, needed for %s, is not in the repository", h, what),
		Hint: hint,
	}
}

// Lacking says how to get what this repository lacks by its nature, as a shallow clone
// does; empty where it should lack nothing.
func (r *Repo) Lacking() string { return r.lackingHint() }

// lackingHint says how to get what this repository lacks by its nature; "" where
// it should lack nothing.
func (r *Repo) lackingHint() string {
	var hints []string
	for _, dir := range r.store.lacking {
		hints = append(hints, fmt.Sprintf("this repository borrows objects from the folder %q, which is not there: bring it back", dir))
	}
	if len(r.shallow) > 0 {
		hints = append(hints, "this is a shallow clone: fetch the rest with `git fetch --unshallow`")
	}
	if r.partial {
		// Only later versions of git have backfill.
		hints = append(hints, "this is a partial clone: fetch what it left out with `git fetch --refetch --no-filter` or `git backfill`")
	}
	if hints == nil {
		return ""
	}
	return strings.Join(append(hints, "or use a complete clone"), "; ")
}

// tree gives the entries of a tree object, sorted by name.
func (r *Repo) tree(h plumbing.Hash, what string) ([]treeEntry, error) {
	if h == emptyTree {
		return nil, nil
	}
	if entries, ok := r.trees.get(h); ok {
		return entries, nil
	}
	data, err := r.read(h, plumbing.TreeObject, maxTree, what)
	if err != nil {
		return nil, err
	}
	entries, err := parseTree(data)
	if err != nil {
		return nil, malformed(fmt.Sprintf("tree %s is malformed", h), err)
	}
	r.trees.put(h, entries)
	return entries, nil
}

// commit reads one commit.
func (r *Repo) commit(h plumbing.Hash) (Commit, error) {
	data, err := r.read(h, plumbing.CommitObject, maxCommit, "the history")
	if err != nil {
		return Commit{}, err
	}
	c, err := parseCommit(data)
	if err != nil {
		return Commit{}, corrupt(fmt.Sprintf("commit %s is malformed", h), err)
	}
	c.Hash, c.Boundary = h.String(), r.shallow[h]
	return c, nil
}

// maxTreeCache bounds the tree entries that are kept, in number.
const maxTreeCache = 200_000

// treeCache keeps parsed trees. When it is full it begins anew: trees are cheap
// to read again.
type treeCache struct {
	mu      sync.Mutex
	trees   map[plumbing.Hash][]treeEntry
	entries int
}

func (c *treeCache) get(h plumbing.Hash) ([]treeEntry, bool) {
	c.mu.Lock()
	defer c.mu.Unlock()
	entries, ok := c.trees[h]
	return entries, ok
}

func (c *treeCache) put(h plumbing.Hash, entries []treeEntry) {
	c.mu.Lock()
	defer c.mu.Unlock()
	if c.entries+len(entries) > maxTreeCache || c.trees == nil {
		c.trees, c.entries = map[plumbing.Hash][]treeEntry{}, 0
	}
	c.trees[h] = entries
	c.entries += len(entries)
}
