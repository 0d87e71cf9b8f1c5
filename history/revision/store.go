package revision

import (
	"bytes"
	"cmp"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"sync"

	"github.com/go-git/go-git/v5/plumbing"
	"github.com/pjbgf/sha1cd"
)

// maxAlternates bounds how many object folders a repository may borrow from;
// maxAlternateDepth how many may lead to one another in a row (git's own limit).
const (
	maxAlternates     = 64
	maxAlternateDepth = 6
)

// store reads the objects of a repository: loose ones, those in packs, and those
// of the object folders that the repository borrows from. It reads files by
// position and shares no reader between calls, so it is safe for concurrent use
// and two readers run side by side.
type store struct {
	dirs    []string // object folders, the repository's own first
	lacking []string // those that are named and not there, which hold it up only where they are needed
	bases   *baseCache
	blocks  *blockCache

	mu    sync.RWMutex
	packs []*pack
	known map[string]bool // names of the packs that were opened
	ready bool            // packs have been looked for
	dead  []*pack         // replaced ones, closed at the end as readers may hold them
}

func newStore(commonDir string) (*store, error) {
	s := &store{known: map[string]bool{}, bases: newBaseCache(), blocks: newBlockCache()}
	if err := s.addDir(filepath.Join(commonDir, "objects"), 0); err != nil {
		return nil, err
	}
	return s, nil
}

// addDir adds an object folder and those it borrows from: info/alternates holds
// a path a line, relative ones counting from the object folder.
func (s *store) addDir(dir string, depth int) error {
	if real, err := filepath.EvalSymlinks(dir); err == nil {
		dir = real
	}
	if slices.Contains(s.dirs, dir) {
		return nil
	}
	if depth > maxAlternateDepth || len(s.dirs) == maxAlternates {
		return fmt.Errorf("%q: too many alternate object folders", dir)
	}
	s.dirs = append(s.dirs, dir)
	text, err := readSmall(filepath.Join(dir, "info", "alternates"))
	if errors.Is(err, fs.ErrNotExist) {
		return nil
	}
	if err != nil {
		return err
	}
	for line := range strings.Lines(text) {
		line = strings.TrimRight(line, "\r\n")
		if line == "" || line[0] == '#' {
			continue
		}
		if line[0] == '"' {
			// git quotes paths with unusual characters as in C.
			if unquoted, err := strconv.Unquote(line); err == nil {
				line = unquoted
			}
		}
		path := filepath.FromSlash(line)
		if !filepath.IsAbs(path) {
			path = filepath.Join(dir, path)
		}
		info, err := os.Stat(path)
		if errors.Is(err, fs.ErrPermission) {
			return fmt.Errorf("alternate object folder %q, named in %q: %w", line, dir, err)
		}
		if err != nil || !info.IsDir() {
			s.lacking = append(s.lacking, path)
			continue
		}
		if err := s.addDir(path, depth+1); err != nil {
			return err
		}
	}
	return nil
}

// close closes all packs. No other call may be under way or follow.
func (s *store) close() error {
	s.mu.Lock()
	defer s.mu.Unlock()
	var errs []error
	for _, p := range append(s.packs, s.dead...) {
		errs = append(errs, p.close())
	}
	s.packs, s.dead = nil, nil
	return errors.Join(errs...)
}

// current gives the packs, looking for new ones first when asked to, or when
// that has never been done.
func (s *store) current(again bool) ([]*pack, error) {
	s.mu.RLock()
	packs, ready := s.packs, s.ready
	s.mu.RUnlock()
	if ready && !again {
		return packs, nil
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.ready && !again {
		return s.packs, nil
	}
	// A new slice, as readers may be going through the old one.
	packs = slices.Clone(s.packs)
	for _, dir := range s.dirs {
		files, err := os.ReadDir(filepath.Join(dir, "pack"))
		if err != nil && !errors.Is(err, fs.ErrNotExist) {
			return nil, unreadable("packs cannot be listed", err)
		}
		for _, f := range files {
			base, ok := strings.CutSuffix(f.Name(), ".idx")
			name := filepath.Join(dir, "pack", base)
			if !ok || s.known[name] {
				continue
			}
			index, err := openIndex(name + ".idx")
			if errors.Is(err, fs.ErrNotExist) {
				continue // repacked a moment ago
			}
			if errors.Is(err, errOldIndex) {
				return nil, &Error{
					Kind: ErrUnsupported, Text: fmt.Sprintf("pack index %q", name+".idx"), Err: err,
					Hint: "write it anew with `git repack -ad` in the repository it belongs to, where pack.indexVersion must not be set to 1",
				}
			}
			if err != nil {
				return nil, corrupt("pack index cannot be read", err)
			}
			s.known[name] = true
			packs = append(packs, &pack{name: name, index: index})
		}
	}
	// The largest pack first: it holds most objects.
	slices.SortStableFunc(packs, func(a, b *pack) int { return cmp.Compare(b.index.count(), a.index.count()) })
	s.packs, s.ready = packs, true
	return packs, nil
}

// drop forgets a pack whose file is gone.
func (s *store) drop(gone *pack) {
	s.mu.Lock()
	defer s.mu.Unlock()
	delete(s.known, gone.name)
	if i := slices.Index(s.packs, gone); i >= 0 {
		s.packs = slices.Delete(slices.Clone(s.packs), i, i+1)
		s.dead = append(s.dead, gone)
	}
}

// errAbsent says that an object is in none of the object folders.
var errAbsent = errors.New("not in the repository")

// object is one object that was found.
type object struct {
	hash  plumbing.Hash
	kind  plumbing.ObjectType
	size  int64
	store *store

	pack   *pack // nil for a loose object
	file   *os.File
	offset int64

	loose string // path of a loose object
}

// find locates an object and reads its type and size. When the object is not
// there, or its pack has gone, the packs are looked for anew once: another
// process may have repacked.
func (s *store) find(h plumbing.Hash) (*object, error) {
	for _, again := range []bool{false, true} {
		packs, err := s.current(again)
		if err != nil {
			return nil, err
		}
		for _, p := range packs {
			offset, ok, err := p.index.offset(h)
			if err != nil {
				return nil, corrupt(fmt.Sprintf("pack index of %q cannot be read", p.name), err)
			}
			if !ok {
				continue
			}
			f, err := p.open()
			if errors.Is(err, fs.ErrNotExist) {
				s.drop(p)
				continue
			}
			if err != nil {
				return nil, corrupt(fmt.Sprintf("object %s cannot be read", h), err)
			}
			o := &object{hash: h, store: s, pack: p, file: f, offset: offset}
			if o.kind, o.size, err = p.describe(f, offset); err != nil {
				return nil, corrupt(fmt.Sprintf("object %s in pack %q cannot be read", h, p.name), err)
			}
			return o, nil
		}
		for _, dir := range s.dirs {
			name := hex2(dir, h)
			f, err := os.Open(name)
			if errors.Is(err, fs.ErrNotExist) {
				continue
			}
			if err != nil {
				return nil, unreadable(fmt.Sprintf("object %s cannot be read", h), err)
			}
			o := &object{hash: h, store: s, loose: name}
			z, err := o.openLoose(f)
			if err != nil {
				f.Close()
				return nil, corrupt(fmt.Sprintf("loose object %s cannot be read", h), err)
			}
			z.release()
			f.Close()
			return o, nil
		}
	}
	return nil, errAbsent
}

// hex2 is the path of a loose object: the first two digits name its folder.
func hex2(dir string, h plumbing.Hash) string {
	s := h.String()
	return filepath.Join(dir, s[:2], s[2:])
}

// openLoose begins to read a loose object and takes in its head: type, space,
// size in decimal, zero byte.
func (o *object) openLoose(f *os.File) (*inflater, error) {
	z, err := inflate(f, 0)
	if err != nil {
		return nil, err
	}
	var head [32]byte
	for i := range head {
		if _, err := io.ReadFull(z, head[i:i+1]); err != nil {
			z.release()
			return nil, noEOF(err)
		}
		if head[i] != 0 {
			continue
		}
		kind, size, ok := bytes.Cut(head[:i], []byte(" "))
		if o.kind, err = plumbing.ParseObjectType(string(kind)); err != nil || !ok {
			break
		}
		if o.size, err = strconv.ParseInt(string(size), 10, 64); err != nil || o.size < 0 {
			break
		}
		return z, nil
	}
	z.release()
	return nil, errors.New("malformed head")
}

// read gives the whole content of an object, checked against its hash.
func (o *object) read() ([]byte, error) {
	data, err := o.content()
	if err == nil {
		err = sumIs(o.kind, data, o.hash)
	}
	if err != nil {
		return nil, corrupt(fmt.Sprintf("object %s cannot be read", o.hash), err)
	}
	return data, nil
}

func (o *object) content() ([]byte, error) {
	if o.pack != nil {
		_, data, err := o.pack.read(o.file, o.offset, o.store.bases)
		return data, err
	}
	f, err := os.Open(o.loose)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	z, err := o.openLoose(f)
	if err != nil {
		return nil, err
	}
	defer z.release()
	return readExactly(z, o.size)
}

// summing computes the hash of an object, and finds out whether its bytes were made to
// collide with others.
type summing = sha1cd.CollisionResistantHash

func newSumming() summing { return sha1cd.New().(summing) }

// newSum begins the hash of an object.
func newSum(kind plumbing.ObjectType, size int64) summing {
	sum := newSumming()
	writeHead(sum, kind, size)
	return sum
}

// writeHead writes what Git puts before the content to hash an object: its type
// and size.
func writeHead(sum summing, kind plumbing.ObjectType, size int64) {
	var head [32]byte
	text := append(append(head[:0], kind.Bytes()...), ' ')
	sum.Write(append(strconv.AppendInt(text, size, 10), 0))
}

var (
	errHash    = errors.New("content does not have this hash")
	errCollide = errors.New("content was made to have the hash of other content")
)

// checkSum checks a hash. What is approved is known by its hash, so that no content
// may stand for another: SHA-1 is broken, and the known ways to break it leave marks.
func checkSum(sum summing, want plumbing.Hash) error {
	var have [sha1cd.Size]byte
	switch got, collides := sum.CollisionResistantSum(have[:0]); {
	case collides:
		return errCollide
	case !bytes.Equal(got, want[:]):
		return errHash
	}
	return nil
}

// withPrefix gives the objects whose hash begins with some hexadecimal digits,
// at most limit of them, in ascending order and each once.
func (s *store) withPrefix(digits string, limit int) ([]plumbing.Hash, error) {
	prefix, ok := parseHash(digits + strings.Repeat("0", 40-len(digits)))
	if !ok {
		return nil, nil
	}
	found := map[plumbing.Hash]bool{}
	add := func(h plumbing.Hash) {
		if len(found) < limit {
			found[h] = true
		}
	}
	packs, err := s.current(true)
	if err != nil {
		return nil, err
	}
	for _, p := range packs {
		if err := p.index.withPrefix(prefix, len(digits), add); err != nil {
			return nil, corrupt(fmt.Sprintf("pack index of %q cannot be read", p.name), err)
		}
	}
	for _, dir := range s.dirs {
		folder := digits[:2]
		files, err := os.ReadDir(filepath.Join(dir, folder))
		if err != nil && !errors.Is(err, fs.ErrNotExist) {
			return nil, unreadable("objects cannot be listed", err)
		}
		for _, f := range files {
			if h, ok := parseHash(folder + f.Name()); ok && hasPrefix(h, prefix, len(digits)) {
				add(h)
			}
		}
	}
	var out []plumbing.Hash
	for h := range found {
		out = append(out, h)
	}
	slices.SortFunc(out, func(a, b plumbing.Hash) int { return bytes.Compare(a[:], b[:]) })
	return out, nil
}
