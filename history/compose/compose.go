// Package compose writes a new Git repository with a given history. The same
// history gives the same commit hashes on every machine: dates, names and
// parents are all given, and no configuration of the user is asked.
//
//	err := compose.Write(ctx, dir, []compose.Commit{{Files: map[string]string{"a.txt": "a\n"}, Message: "Start", ...}})
//
// A folder that is not empty is refused. What was written is removed again when
// something fails.
package compose

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"time"

	"github.com/go-git/go-git/v5"
	"github.com/go-git/go-git/v5/plumbing"
	"github.com/go-git/go-git/v5/plumbing/filemode"
	"github.com/go-git/go-git/v5/plumbing/object"
	"github.com/go-git/go-git/v5/storage"
)

// The errors of Write for a folder that holds something, and for a history that
// no repository can have; the latter says which commit and what is wrong.
var (
	ErrNotEmpty = errors.New("the folder is not empty")
	ErrHistory  = errors.New("not a history")
)

// Branch is the name of the branch that a written repository has.
const Branch = "main"

// Person is an author, a committer or a tagger.
type Person struct{ Name, Email string }

// Commit is one commit of the history.
type Commit struct {
	Parents   []int // indices of earlier commits
	Files     map[string]string
	Author    Person
	Committer Person // the author, if zero
	When      time.Time
	Message   string
	Tag       string // name of an annotated tag, empty for none
	TagText   string
}

// Write writes the repository into dir, made if need be, and checks out the last
// commit.
func Write(ctx context.Context, dir string, history []Commit) (err error) {
	if err := check(history); err != nil {
		return err
	}
	entries, err := os.ReadDir(dir)
	undo := Undo(dir)
	switch {
	case err == nil && len(entries) > 0:
		return ErrNotEmpty
	case err != nil && !errors.Is(err, os.ErrNotExist):
		return err
	}
	defer func() {
		if err != nil {
			undo()
		}
	}()
	if err := os.MkdirAll(dir, 0o755); err != nil {
		return err
	}
	repo, err := git.PlainInit(dir, false)
	if err != nil {
		return err
	}
	w := writer{store: repo.Storer}
	for i, c := range history {
		if err := ctx.Err(); err != nil {
			return err
		}
		if err := w.commit(c); err != nil {
			return fmt.Errorf("commit %d: %w", i, err)
		}
	}
	head := plumbing.NewBranchReferenceName(Branch)
	if err := repo.Storer.SetReference(plumbing.NewHashReference(head, w.commits[len(w.commits)-1])); err != nil {
		return err
	}
	if err := repo.Storer.SetReference(plumbing.NewSymbolicReference(plumbing.HEAD, head)); err != nil {
		return err
	}
	// The files are bytes; the user's line end settings must not touch them.
	config := filepath.Join(dir, ".git", "config")
	f, err := os.OpenFile(config, os.O_APPEND|os.O_WRONLY, 0)
	if err != nil {
		return err
	}
	_, err = f.WriteString("[core]\n\tautocrlf = false\n")
	if err := errors.Join(err, f.Close()); err != nil {
		return err
	}
	work, err := repo.Worktree()
	if err != nil {
		return err
	}
	return work.Reset(&git.ResetOptions{Commit: w.commits[len(w.commits)-1], Mode: git.HardReset})
}

// missing gives the folders above dir that are not there, the lowest first.
func missing(dir string) []string {
	var out []string
	for at := filepath.Dir(filepath.Clean(dir)); ; at = filepath.Dir(at) {
		if _, err := os.Lstat(at); !errors.Is(err, os.ErrNotExist) || at == filepath.Dir(at) {
			return out
		}
		out = append(out, at)
	}
}

// Undo gives a function that takes away what is written into dir from now on,
// for a dir that is empty or not there. An empty folder that is there stays; of
// those above that are made, the ones that are empty go.
func Undo(dir string) func() {
	_, err := os.Lstat(dir)
	existed, made := err == nil, missing(dir)
	return func() {
		if !existed {
			os.RemoveAll(dir)
			for _, name := range made {
				os.Remove(name)
			}
			return
		}
		entries, _ := os.ReadDir(dir)
		for _, e := range entries {
			os.RemoveAll(filepath.Join(dir, e.Name()))
		}
	}
}

type writer struct {
	store   storage.Storer
	commits []plumbing.Hash
}

func (w *writer) commit(c Commit) error {
	tree, err := w.tree(c.Files)
	if err != nil {
		return err
	}
	if c.Committer == (Person{}) {
		c.Committer = c.Author
	}
	o := &object.Commit{
		Author: signature(c.Author, c.When), Committer: signature(c.Committer, c.When),
		Message: c.Message, TreeHash: tree,
	}
	for _, p := range c.Parents {
		o.ParentHashes = append(o.ParentHashes, w.commits[p])
	}
	hash, err := w.save(o)
	if err != nil {
		return err
	}
	w.commits = append(w.commits, hash)
	if c.Tag == "" {
		return nil
	}
	tag, err := w.save(&object.Tag{
		Name: c.Tag, Tagger: signature(c.Committer, c.When), Message: c.TagText, TargetType: plumbing.CommitObject, Target: hash,
	})
	if err != nil {
		return err
	}
	return w.store.SetReference(plumbing.NewHashReference(plumbing.NewTagReferenceName(c.Tag), tag))
}

func signature(p Person, when time.Time) object.Signature {
	return object.Signature{Name: p.Name, Email: p.Email, When: when}
}

type encoder interface {
	Encode(plumbing.EncodedObject) error
}

func (w *writer) save(o encoder) (plumbing.Hash, error) {
	e := w.store.NewEncodedObject()
	if err := o.Encode(e); err != nil {
		return plumbing.ZeroHash, err
	}
	return w.store.SetEncodedObject(e)
}

// tree writes the files, paths with slashes, as trees and blobs.
func (w *writer) tree(files map[string]string) (plumbing.Hash, error) {
	var t object.Tree
	inner := map[string]map[string]string{}
	for path, content := range files {
		name, rest, nested := strings.Cut(path, "/")
		if nested {
			if inner[name] == nil {
				inner[name] = map[string]string{}
			}
			inner[name][rest] = content
			continue
		}
		hash, err := w.blob(content)
		if err != nil {
			return hash, err
		}
		t.Entries = append(t.Entries, object.TreeEntry{Name: name, Mode: filemode.Regular, Hash: hash})
	}
	for name, files := range inner {
		hash, err := w.tree(files)
		if err != nil {
			return hash, err
		}
		t.Entries = append(t.Entries, object.TreeEntry{Name: name, Mode: filemode.Dir, Hash: hash})
	}
	// Git sorts folders as if their names ended in a slash.
	key := func(e object.TreeEntry) string {
		if e.Mode == filemode.Dir {
			return e.Name + "/"
		}
		return e.Name
	}
	slices.SortFunc(t.Entries, func(a, b object.TreeEntry) int { return strings.Compare(key(a), key(b)) })
	return w.save(&t)
}

func (w *writer) blob(content string) (plumbing.Hash, error) {
	e := w.store.NewEncodedObject()
	e.SetType(plumbing.BlobObject)
	out, err := e.Writer()
	if err != nil {
		return plumbing.ZeroHash, err
	}
	if _, err := out.Write([]byte(content)); err != nil {
		return plumbing.ZeroHash, err
	}
	if err := out.Close(); err != nil {
		return plumbing.ZeroHash, err
	}
	return w.store.SetEncodedObject(e)
}
