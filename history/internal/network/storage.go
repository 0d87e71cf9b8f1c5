package network

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"
)

// Storage is how the objects of a repository lie on disk.
type Storage string

// The forms of storage: everything in one pack by `git repack`; as `git
// fast-import` leaves it; the same number of commits in each of twelve packs, as
// pushes leave them; every object in a file of its own.
const (
	OnePack     Storage = "one-pack"
	Imported    Storage = "un-repacked"
	TwelvePacks Storage = "12-packs"
	Loose       Storage = "all-loose"
)

// Storages lists the forms of storage.
var Storages = []Storage{OnePack, Imported, TwelvePacks, Loose}

// store brings the objects of a new repository into a form.
func (s Storage) store(ctx context.Context, dir string) error {
	switch s {
	case Imported:
		return nil
	case TwelvePacks:
		return twelvePacks(ctx, dir)
	case Loose:
		return loose(ctx, dir)
	}
	return Git(ctx, dir, nil, "repack", "-adfq")
}

// twelvePacks writes packs of what each twelfth of the history adds.
func twelvePacks(ctx context.Context, dir string) error {
	out, err := Command(ctx, dir, "rev-list", "--reverse", "HEAD").Output()
	if err != nil {
		return err
	}
	commits := strings.Fields(string(out))
	old, err := packs(dir)
	if err != nil {
		return err
	}
	const parts = 12
	before := ""
	for i := range parts {
		tip := commits[len(commits)*(i+1)/parts-1]
		revisions := tip + "\n"
		if before != "" {
			revisions += "^" + before + "\n"
		}
		if err := Git(ctx, dir, strings.NewReader(revisions), "pack-objects", "-q", "--revs", filepath.Join(".git", "objects", "pack", "pack")); err != nil {
			return err
		}
		before = tip
	}
	for _, name := range old {
		for _, end := range []string{".pack", ".idx", ".rev"} {
			if err := os.Remove(name + end); err != nil && !errors.Is(err, os.ErrNotExist) {
				return err
			}
		}
	}
	return Git(ctx, dir, nil, "rev-list", "--objects", "--all", "--quiet")
}

// loose unpacks all packs.
func loose(ctx context.Context, dir string) error {
	list, err := packs(dir)
	if err != nil {
		return err
	}
	for i, name := range list {
		aside := filepath.Join(dir, fmt.Sprintf("%d.pack", i))
		if err := os.Rename(name+".pack", aside); err != nil {
			return err
		}
		if err := os.Remove(name + ".idx"); err != nil {
			return err
		}
		f, err := os.Open(aside)
		if err != nil {
			return err
		}
		err = Git(ctx, dir, f, "unpack-objects", "-q")
		if err = errors.Join(err, f.Close(), os.Remove(aside)); err != nil {
			return err
		}
	}
	return nil
}

// packs lists the packs of a repository, without the ends of their names.
func packs(dir string) ([]string, error) {
	list, err := filepath.Glob(filepath.Join(dir, ".git", "objects", "pack", "*.pack"))
	for i := range list {
		list[i] = strings.TrimSuffix(list[i], ".pack")
	}
	return list, err
}
